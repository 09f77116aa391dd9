import { DEFAULT_SETTINGS, type Role, type Settings } from '../../../src/sheet'
import { settingsFromJson, settingsToJson } from '../../../src/sheet/settings'

test('settings come back from a workbook as they were saved', () => {
  const settings: Settings = {
    estimator: { kind: 'exponential', decay: 0.97 },
    lookBack: { kind: 'since', date: 46000 },
    periodsPerYear: 12,
    content: 'prices',
    returnKind: 'log',
    orientation: 'dates across',
    capital: 1000,
    riskless: ['Cash'],
    roles: { Stake: 'weight' },
    gaps: 'own overlap',
    repair: 'shrunk',
    benchmark: { kind: 'series', name: 'Index' },
    convention: 'benchmark-relative returns',
    currency: { base: 'EUR', returnsIn: 'local' },
    tails: { method: { kind: 'student', degrees: null }, confidence: 0.99, periods: 4 },
    nesting: ['Region', 'Class'],
  }
  const saved = JSON.parse(JSON.stringify(settingsToJson(settings))) as Parameters<typeof settingsFromJson>[0]
  expect(settingsFromJson(saved)).toEqual({ settings, unread: [] })
})

test('what someone has spoilt falls back to its default and is named', () => {
  const { settings, unread } = settingsFromJson({
    estimator: { kind: 'exponential', decay: 7 },
    lookBack: 'yesterday',
    periodsPerYear: -1,
    roles: { A: 'weight', B: 'boss' },
    riskless: [1, 'Cash'],
  })
  expect(settings).toEqual({ ...DEFAULT_SETTINGS, riskless: ['Cash'], roles: { A: 'weight' } })
  expect([...unread].sort()).toEqual(['estimator', 'lookBack', 'periodsPerYear', 'role of B'])
})

test.each([[null], ['text'], [[1, 2]], [7], [undefined]])('%j gives the defaults', (saved) => {
  expect(settingsFromJson(saved).settings).toEqual(DEFAULT_SETTINGS)
})

test('roles survive whatever their heading is called', () => {
  const roles = JSON.parse('{ "__proto__": "weight", "constructor": "name" }') as Record<string, Role>
  const { settings } = settingsFromJson(settingsToJson({ ...DEFAULT_SETTINGS, roles }))
  expect(Object.entries(settings.roles)).toEqual([
    ['__proto__', 'weight'],
    ['constructor', 'name'],
  ])
})

test.each([
  [{ base: ' ', returnsIn: 'base' }],
  [{ base: 'EUR', returnsIn: 'mixed' }],
  [{ base: 7, returnsIn: 'base' }],
  ['EUR'],
])('the currency %j is none and is named', (currency) => {
  const { settings, unread } = settingsFromJson({ currency })
  expect([settings.currency, unread]).toEqual([null, ['currency']])
})

test.each<Settings['estimator']>([
  { kind: 'sample' },
  { kind: 'factors' },
  { kind: 'shrinkage', target: 'correlation' },
  { kind: 'lagged', lags: 10 },
])('the estimator %j is read back', (estimator) => {
  expect(settingsFromJson(settingsToJson({ ...DEFAULT_SETTINGS, estimator })).settings.estimator).toEqual(
    estimator,
  )
})

test.each([
  ['estimator', { kind: 'shrinkage', target: 'zero' }],
  ['estimator', { kind: 'lagged', lags: 11 }],
  ['estimator', { kind: 'lagged', lags: 1.5 }],
  ['gaps', 'filled'],
  ['repair', 'hammer'],
  ['benchmark', { kind: 'series' }],
  ['convention', 'mine'],
  ['tails', { method: { kind: 'student', degrees: 2 }, confidence: 0.99, periods: 1 }],
  ['tails', { method: { kind: 'normal' }, confidence: 0.4, periods: 1 }],
  ['nesting', 'Region'],
])('%s %j falls back to its default and is named', (key, value) => {
  expect(settingsFromJson({ [key]: value })).toEqual({ settings: DEFAULT_SETTINGS, unread: [key] })
})

test('riskless holdings that are no list are named as unread', () => {
  expect(settingsFromJson({ riskless: 'Cash' }).unread).toEqual(['riskless'])
})
