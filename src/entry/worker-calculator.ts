import { Fault, type FaultCode, type Where } from '../core'
import { cancelledFault, jobWords, steppingCalculator } from '../sheet'
import type { Calculator, JobInput, JobKind, JobResult, Work } from '../sheet'

/** What goes to the worker and what comes back: plain data. */
export interface Question {
  readonly kind: JobKind
  readonly input: unknown
}
export type Answer =
  | { readonly kind: 'progress'; readonly share: number }
  | { readonly kind: 'result'; readonly value: unknown }
  | {
      readonly kind: 'fault'
      readonly code: FaultCode
      readonly found: string
      readonly needed: string
      readonly where: Where
    }
  | { readonly kind: 'error'; readonly message: string }

/**
 * A calculator in a worker, so that the pane goes on answering. One computation at a time; cancelling ends the worker, which no
 * computation can refuse, and the next one starts a new worker. A host that allows no worker gets the calculator of this thread.
 */
export function workerCalculator(): Calculator {
  let idle: Worker | null = null
  let queue: Promise<unknown> = Promise.resolve()

  function newWorker(): Worker | null {
    try {
      return new Worker(new URL('./worker.ts', import.meta.url))
    } catch {
      return null
    }
  }

  async function runOne<K extends JobKind>(kind: K, input: JobInput<K>, work: Work): Promise<JobResult<K>> {
    if (work.signal.aborted) throw cancelledFault()
    const worker = idle ?? newWorker()
    idle = null
    if (!worker) return steppingCalculator.run(kind, input, work)
    return new Promise<JobResult<K>>((resolve, reject) => {
      const settle = (outcome: () => void, reusable: boolean): void => {
        work.signal.removeEventListener('abort', cancel)
        worker.onmessage = worker.onerror = null
        if (reusable) idle = worker
        else worker.terminate()
        outcome()
      }
      const cancel = (): void => settle(() => reject(cancelledFault()), false)
      work.signal.addEventListener('abort', cancel)
      worker.onmessage = ({ data }: MessageEvent<Answer>) => {
        switch (data.kind) {
          case 'progress':
            return work.progress(jobWords(kind), data.share)
          case 'result':
            return settle(() => resolve(data.value as JobResult<K>), true)
          case 'fault':
            return settle(() => reject(new Fault(data.code, data.found, data.needed, data.where)), true)
          case 'error':
            return settle(() => reject(new Error(data.message)), true)
        }
      }
      // the script could not be loaded or run at all
      worker.onerror = (event) => {
        event.preventDefault()
        settle(() => steppingCalculator.run(kind, input, work).then(resolve, reject), false)
      }
      worker.postMessage({ kind, input } satisfies Question)
    })
  }

  return {
    run(kind, input, work) {
      const result = queue.then(() => runOne(kind, input, work))
      queue = result.catch(() => undefined)
      return result
    },
  }
}
