import { decompose, groupDecomposition, returnsModel } from '../../../src/core'

type Core = typeof import('../../../src/core')

/** The core as a host loads it whose WebAssembly is as given. */
function coreIn(webAssembly: unknown, work: (core: Core) => void): void {
  const original = Object.getOwnPropertyDescriptor(globalThis, 'WebAssembly')!
  Object.defineProperty(globalThis, 'WebAssembly', { ...original, value: webAssembly })
  try {
    jest.isolateModules(() => {
      work(jest.requireActual<Core>('../../../src/core'))
    })
  } finally {
    Object.defineProperty(globalThis, 'WebAssembly', original)
  }
}

const returns = Float64Array.from({ length: 60 }, (_, k) => Math.sin(k * k) / 10)
const weights = Float64Array.of(0.5, 0.3, -0.2)
const expected = decompose(returnsModel(returns, 20, 3), weights)

function Refused(): never {
  throw new Error('refused by the content security policy')
}

describe('the plain form takes over, with the same bits,', () => {
  it.each([
    ['where there is no WebAssembly', undefined],
    [
      'where a policy forbids compiling, though validate() says yes',
      { Module: Refused, validate: () => true },
    ],
  ])('%s', (_name, webAssembly) => {
    coreIn(webAssembly, (core) => {
      expect(core.kernelForm).toBe('plain')
      const model = core.returnsModel(returns, 20, 3)
      expect(model.form).toBe('plain')
      expect(core.decompose(model, weights)).toEqual(expected)
    })
  })

  it('where the memory of one block is refused, for that block, and says so', () => {
    const { Module, Instance } = WebAssembly
    coreIn({ Module, Instance, Memory: Refused }, (core) => {
      expect(core.kernelForm).toBe('simd')
      const model = core.returnsModel(returns, 20, 3)
      expect(model.form).toBe('plain')
      expect(core.decompose(model, weights)).toEqual(expected)
    })
  })
})

it('the covariance matrix of a block is not formed by a decomposition', () => {
  const model = {
    ...returnsModel(returns, 20, 3),
    matrix: () => {
      throw new Error('the matrix was formed')
    },
  }
  const d = decompose(model, weights)
  expect(d).toEqual(expected)
  expect(groupDecomposition(model, d, Int32Array.of(0, 1, 0), 2).contribution).toHaveLength(2)
})
