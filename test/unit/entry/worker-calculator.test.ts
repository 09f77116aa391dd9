/** The worker's two sides, joined as a browser joins them: what passes is copied, and answers come later. */
import type { Answer, Question } from '../../../src/entry/worker-calculator'
import { workerCalculator } from '../../../src/entry/worker-calculator'
import { steppingCalculator } from '../../../src/sheet'
import { idleWork } from '../sheet/blocks-of-cells'

interface Scope {
  onmessage: ((event: { data: Question }) => void) | null
  postMessage: (answer: Answer) => void
}

class JoinedWorker {
  static made: JoinedWorker[] = []
  static broken = false
  onmessage: ((event: { data: Answer }) => void) | null = null
  onerror: ((event: { preventDefault(): void }) => void) | null = null
  terminated = false
  readonly questions: Question[] = []

  constructor() {
    JoinedWorker.made.push(this)
  }

  postMessage(question: Question): void {
    this.questions.push(structuredClone(question))
    setTimeout(() => {
      if (this.terminated) return
      if (JoinedWorker.broken) return this.onerror?.({ preventDefault: () => undefined })
      scope.postMessage = (answer) => {
        const copy = structuredClone(answer)
        setTimeout(() => {
          if (!this.terminated) this.onmessage?.({ data: copy })
        })
      }
      scope.onmessage?.({ data: structuredClone(question) })
    })
  }

  terminate(): void {
    this.terminated = true
  }
}

const scope: Scope = { onmessage: null, postMessage: () => undefined }

beforeAll(async () => {
  Object.assign(globalThis, { self: scope, Worker: JoinedWorker })
  await import('../../../src/entry/worker')
})
beforeEach(() => {
  JoinedWorker.made = []
  JoinedWorker.broken = false
})
afterAll(() => {
  Reflect.deleteProperty(globalThis, 'self')
  Reflect.deleteProperty(globalThis, 'Worker')
})

const input = (replicates: number, size = 3) => ({
  returns: Float64Array.from({ length: 60 * size }, (_, k) => 0.01 * Math.sin(k * k)),
  dates: 60,
  size,
  weighting: { kind: 'sample' } as const,
  weights: new Float64Array(size).fill(1 / size),
  choice: { replicates, seed: 3, blockLength: 2 },
})

test('a computation comes back from the worker as it is on this thread, and the worker is used again', async () => {
  const calculator = workerCalculator()
  const here = await steppingCalculator.run('bootstrap', input(50), idleWork())
  expect(await calculator.run('bootstrap', input(50), idleWork())).toEqual(here)
  expect(await calculator.run('bootstrap', input(50), idleWork())).toEqual(here)
  expect(JoinedWorker.made).toHaveLength(1)
})

test('computations wait for one another', async () => {
  const calculator = workerCalculator()
  const first = calculator.run('bootstrap', input(50), idleWork())
  const second = calculator.run('bootstrap', input(40), idleWork())
  const [a, b] = await Promise.all([first, second])
  expect([a.replicates, b.replicates]).toEqual([50, 40])
  expect(JoinedWorker.made).toHaveLength(1)
})

test('a fault in the worker is the same fault here, and the worker lives on', async () => {
  const calculator = workerCalculator()
  const bad = { ...input(50), weights: new Float64Array(2) }
  const [there, here] = await Promise.allSettled([
    calculator.run('bootstrap', bad, idleWork()),
    steppingCalculator.run('bootstrap', bad, idleWork()),
  ])
  expect(there.status).toBe('rejected')
  expect(there).toEqual(here)
  await calculator.run('bootstrap', input(50), idleWork())
  expect(JoinedWorker.made).toHaveLength(1)
})

test('cancelling ends the worker at once, and the next computation has a new one', async () => {
  const calculator = workerCalculator()
  const stop = new AbortController()
  const run = calculator.run('bootstrap', input(50), { ...idleWork(), signal: stop.signal })
  await Promise.resolve()
  await Promise.resolve()
  stop.abort()
  await expect(run).rejects.toMatchObject({ code: 'cancelled' })
  expect(JoinedWorker.made[0]?.terminated).toBe(true)
  await calculator.run('bootstrap', input(50), idleWork())
  expect(JoinedWorker.made).toHaveLength(2)
})

test('one cancelled before its turn starts no worker', async () => {
  const calculator = workerCalculator()
  const stop = new AbortController()
  stop.abort()
  await expect(
    calculator.run('bootstrap', input(50), { ...idleWork(), signal: stop.signal }),
  ).rejects.toMatchObject({ code: 'cancelled' })
  expect(JoinedWorker.made).toHaveLength(0)
})

test('where the worker cannot be loaded the computation runs here', async () => {
  JoinedWorker.broken = true
  const here = await steppingCalculator.run('bootstrap', input(50), idleWork())
  expect(await workerCalculator().run('bootstrap', input(50), idleWork())).toEqual(here)
})
