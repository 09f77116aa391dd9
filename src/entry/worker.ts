import { Fault } from '../core'
import { startJob } from '../sheet'
import type { Answer, Question } from './worker-calculator'

/** The other side of a worker calculator: runs one computation after another, telling how far it is. */

/** Answers are told this far apart: a screen shows no more. */
const TELLING_MS = 60

const scope = self as unknown as {
  onmessage: ((event: MessageEvent<Question>) => void) | null
  postMessage(answer: Answer): void
}

scope.onmessage = ({ data: { kind, input } }) => {
  try {
    const steps = startJob(kind, input)
    for (let told = performance.now(); ;) {
      const step = steps.next()
      if (step.done) return scope.postMessage({ kind: 'result', value: step.value })
      if (performance.now() - told < TELLING_MS) continue
      scope.postMessage({ kind: 'progress', share: step.value })
      told = performance.now()
    }
  } catch (error) {
    // classes do not cross; a fault is told by its parts
    scope.postMessage(
      error instanceof Fault
        ? {
            kind: 'fault',
            code: error.code,
            found: error.found,
            needed: error.needed,
            where: error.where,
          }
        : { kind: 'error', message: error instanceof Error ? error.message : String(error) },
    )
  }
}
