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

test('riskless holdings that are no list are named as unread', () => {
  expect(settingsFromJson({ riskless: 'Cash' }).unread).toEqual(['riskless'])
})
