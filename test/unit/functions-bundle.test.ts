import { mkdtempSync, readFileSync, rmSync, writeFileSync } from 'node:fs'
import { tmpdir } from 'node:os'
import { join } from 'node:path'
import { createContext, runInContext } from 'node:vm'
import { refresh, root } from '../../src/build/bundles.cjs'
import { describeFunctions, objections } from '../../src/build/functions-metadata.cjs'

interface Parameter {
  readonly name: string
  readonly type: string
  readonly dimensionality?: string
  readonly optional?: boolean
}
interface Described {
  readonly id: string
  readonly name: string
  readonly description: string
  readonly helpUrl: string
  readonly parameters: readonly Parameter[]
  readonly result: { readonly dimensionality?: string }
}

/** The functions as they were released: ids and names never change, and new arguments come last. */
const released: Record<string, string> = {
  RETURNS: 'prices, [kind]',
  COVARIANCE: 'returns, [periods_per_year], [estimator]',
  CORRELATION: 'returns, [estimator]',
  VOLATILITY: 'weights, risk, [periods_per_year], [estimator]',
  STANDALONE: 'weights, risk, [periods_per_year], [estimator]',
  MARGINAL: 'weights, risk, [periods_per_year], [estimator]',
  CONTRIBUTION: 'weights, risk, [periods_per_year], [estimator]',
  RISKSHARE: 'weights, risk, [estimator]',
  RISKSHAREERROR: 'weights, returns, [estimator]',
  BETA: 'weights, risk, [estimator]',
  DIVERSIFICATION: 'weights, risk, [estimator]',
  EFFECTIVE: 'weights, risk, [estimator]',
  LEASTRISKWEIGHT: 'weights, risk, [estimator]',
  BUDGETWEIGHTS: 'risk, [budgets], [estimator]',
  BREAKDOWN: 'names, weights, risk, [periods_per_year], [estimator]',
  GROUPED: 'groups, weights, risk, [periods_per_year], [estimator]',
  VALUEATRISK: 'weights, risk, confidence, [periods], [method], [estimator]',
  SHORTFALL: 'weights, risk, confidence, [periods], [method], [estimator]',
  SHORTFALLPARTS: 'weights, risk, confidence, [periods], [method], [estimator]',
}
const blocks = ['prices', 'returns', 'weights', 'risk', 'budgets', 'names', 'groups']

type Body = (...cells: unknown[]) => unknown

/** Runs dist/functions.js where nothing is defined but CustomFunctions, and collects what it registers. */
function registered(more: Record<string, unknown> = {}): Map<string, Body> {
  const bodies = new Map<string, Body>()
  const CustomFunctions = { associate: (id: string, body: Body) => void bodies.set(id, body), ...more }
  runInContext(readFileSync(join(root, 'dist/functions.js'), 'utf8'), createContext({ CustomFunctions }))
  return bodies
}

let described: readonly Described[]
beforeAll(async () => {
  await refresh(['functions'])
  const text = readFileSync(join(root, 'dist/functions.json'), 'utf8')
  described = (JSON.parse(text) as { functions: Described[] }).functions
}, 120_000)

describe('dist/functions.json', () => {
  it('describes every function with its arguments in order', () => {
    const said = described.map(({ id, parameters }) => [
      id,
      parameters.map(({ name, optional }) => (optional ? `[${name}]` : name)).join(', '),
    ])
    expect(Object.fromEntries(said)).toEqual(released)
  })

  it('hands blocks over as blocks and every cell as it is, so that a wrong one can be named', () => {
    for (const { parameters } of described) {
      for (const { name, type, dimensionality } of parameters) {
        expect([name, type, dimensionality]).toEqual([
          name,
          'any',
          blocks.includes(name) ? 'matrix' : undefined,
        ])
      }
    }
  })

  it('spills where the result has more than one cell', () => {
    const single = described.filter(({ result }) => result.dimensionality !== 'matrix').map(({ id }) => id)
    expect(single.sort()).toEqual(['DIVERSIFICATION', 'EFFECTIVE', 'SHORTFALL', 'VALUEATRISK', 'VOLATILITY'])
  })

  it('points for help into help.html, where each function has its place', () => {
    const page = readFileSync(join(root, 'dist/help.html'), 'utf8')
    for (const { helpUrl } of described) {
      expect(helpUrl).toMatch(/^https:\/\/localhost:3000\/help\.html#./)
      expect(page).toMatch(new RegExp(`<section id="${new URL(helpUrl).hash.slice(1)}"`))
    }
  })
})

describe('dist/functions.js', () => {
  it('registers every described function where only CustomFunctions is defined', () => {
    expect([...registered().keys()].sort()).toEqual(Object.keys(released).sort())
  })

  it('computes there, in plain cells', () => {
    // w = (0.5, 0.5), variances 0.04 and 0.01, no covariance: sqrt(0.25 * 0.04 + 0.25 * 0.01), by hand.
    const volatility = registered().get('VOLATILITY')!
    expect(
      volatility(
        [[0.5], [0.5]],
        [
          [0.04, 0],
          [0, 0.01],
        ],
        null,
        null,
      ),
    ).toBeCloseTo(Math.sqrt(0.0125), 12)
  })

  it("answers wrong cells with the host's own error, which names argument, row and column", () => {
    class CellError {
      constructor(
        readonly code: string,
        readonly message: string,
      ) {}
    }
    const volatility = registered({
      Error: CellError,
      ErrorCode: { invalidValue: '#VALUE!', notAvailable: '#N/A' },
    }).get('VOLATILITY')!
    const raised = () => {
      try {
        return volatility(
          [[0.5], ['half']],
          [
            [0.04, 0],
            [0, 0.01],
          ],
          null,
          null,
        )
      } catch (error) {
        return error
      }
    }
    const error = raised()
    expect(error).toBeInstanceOf(CellError)
    expect((error as CellError).code).toBe('#VALUE!')
    expect((error as CellError).message).toMatch(/weights.*row 2.*half/s)
  })

  it('loads no other file and starts no worker', () => {
    const text = readFileSync(join(root, 'dist/functions.js'), 'utf8')
    expect(text).not.toMatch(/new Worker\(|importScripts|import\.meta|import\(|Automatic publicPath/)
  })
})

describe('what describes the functions', () => {
  const fine = {
    id: 'SPREAD',
    name: 'SPREAD',
    description: 'Difference of two numbers',
    helpUrl: 'https://example.org/help#spread',
    parameters: [{ name: 'a', type: 'any', description: 'the first' }],
    result: { type: 'number' },
  }

  it('is content with a function that is described in full', () => {
    expect(objections(fine)).toEqual([])
  })

  it.each([
    ['A1', 'a cell would read the id as a reference'],
    ['ABC123', 'a cell would read the id as a reference'],
    ['R1C1', 'a cell would read the id as a reference'],
    ['AB', 'an id has 3 or more'],
    ['A-B-C', 'an id has 3 or more'],
  ])('objects to the id %s', (id, sentence) => {
    expect(objections({ ...fine, id, name: id }).join('\n')).toContain(`${id}: ${sentence}`)
  })

  it.each([
    ['a help address that is none', { helpUrl: 'help' }, '@helpurl is "help"'],
    ['a help address without https', { helpUrl: 'http://example.org/' }, '@helpurl is "http://example.org/"'],
    ['a missing description', { description: undefined }, 'the description is missing'],
    [
      'an argument without a description',
      { parameters: [{ name: 'a', type: 'any' }] },
      '@param a is missing',
    ],
    [
      'a row of arguments where a block was meant',
      { parameters: [{ name: 'a', type: 'any', description: 'x', repeating: true }] },
      'a repeats; write unknown[][]',
    ],
  ])('objects to %s', (_, change, sentence) => {
    expect(objections({ ...fine, ...change }).join('\n')).toContain(sentence)
  })

  it('refuses a signature the generator does not know, and a file without functions', async () => {
    const folder = mkdtempSync(join(tmpdir(), 'functions-'))
    const file = join(folder, 'functions.ts')
    try {
      writeFileSync(
        file,
        '/** x\n * @customfunction SPREAD\n */\nexport function spread(a: Cell): number { return 1 }\n',
      )
      await expect(describeFunctions(file)).rejects.toThrow('does not support type "Cell"')
      writeFileSync(file, 'export const nothing = 1\n')
      await expect(describeFunctions(file)).rejects.toThrow('declares no worksheet function')
    } finally {
      rmSync(folder, { recursive: true })
    }
  })
})
