import { DEFAULT_SETTINGS, type Settings } from '../../../src/sheet'
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
