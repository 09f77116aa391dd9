import { spawn } from 'node:child_process'
import { once } from 'node:events'
import path from 'node:path'
import { createInterface } from 'node:readline'

/** A script beside this file in a process of its own, asked for a few timings at a time; undefined where there is no numpy. */
export async function numpy(script) {
  const child = spawn('python3', [path.join(import.meta.dirname, script), '--serve'], {
    stdio: ['pipe', 'pipe', 'ignore'],
  })
  const lines = createInterface({ input: child.stdout })[Symbol.asyncIterator]()
  const failed = once(child, 'error').then(() => ({ done: true }))
  const first = await Promise.race([lines.next(), failed])
  if (first.done) return undefined
  return {
    version: JSON.parse(first.value).numpy,
    async time(name, n, T, repeats) {
      child.stdin.write(`${JSON.stringify({ name, n, T, repeats })}\n`)
      return JSON.parse((await lines.next()).value).ms
    },
    close: () => child.stdin.end(),
  }
}
