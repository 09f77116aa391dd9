/** Conditional formats of a range. Of their kinds the desk keeps data bars, for the file: the grid draws none. */
import { generateRandomId } from '@univerjs/core'
import type { Sheet } from './book'
import type { BarEnd, DataBar } from './custom-data'
import { OfficeError } from './error'
import { RANGE, RANGE_AREAS, type Place, type Places } from './range'
import type { Kind, Scalar } from './request-context'

/** A format is known by its id, so that the object follows it. */
interface Format {
  readonly sheet: Sheet
  readonly id: string
}

function found({ sheet, id }: Format) {
  const bar = sheet.bar(id)
  if (!bar) throw new OfficeError('ItemNotFound', 'the conditional format was deleted')
  return bar
}

/** A property kept as it is set. */
const kept = <K extends keyof DataBar>(
  key: K,
  accepts: (value: DataBar[K]) => boolean = () => true,
): Scalar<Format> => ({
  read: (format) => found(format).bar[key],
  write: (format: Format, value: DataBar[K]) => {
    if (!accepts(value)) throw new OfficeError('InvalidArgument', `${key} of a data bar`)
    const { bar, rects } = found(format)
    for (const rect of rects) format.sheet.setBar(rect, { ...bar, [key]: value })
  },
})

const END_KINDS = ['Automatic', 'LowestValue', 'HighestValue', 'Number', 'Percent', 'Formula', 'Percentile']
const NEED_FORMULA = ['Number', 'Percent', 'Formula', 'Percentile']

const isEnd = (end: BarEnd): boolean =>
  END_KINDS.includes(end.type) && (typeof end.formula === 'string' || !NEED_FORMULA.includes(end.type))

const isColour = (value: string): boolean => value === '' || /^#[0-9a-f]{6}$/i.test(value)

const POSITIVE: Kind<Format> = {
  name: 'ConditionalDataBarPositiveFormat',
  scalars: {
    fillColor: kept('fill', isColour),
    borderColor: kept('border', isColour),
    gradientFill: kept('gradient', (value) => typeof value === 'boolean'),
  },
}

const DATA_BAR: Kind<Format> = {
  name: 'DataBarConditionalFormat',
  scalars: {
    lowerBoundRule: kept('lower', isEnd),
    upperBoundRule: kept('upper', isEnd),
    barDirection: kept('direction', (value) => ['Context', 'LeftToRight', 'RightToLeft'].includes(value)),
  },
  parts: { positiveFormat: { kind: () => POSITIVE, find: (format) => format } },
}

const FORMAT: Kind<Format> = {
  name: 'ConditionalFormat',
  check: (format) => void found(format),
  scalars: { id: { read: ({ id }) => id }, type: { read: () => 'DataBar' } },
  parts: { dataBar: { kind: () => DATA_BAR, find: (format) => format } },
  finds: {
    getRange: {
      kind: () => RANGE,
      find: (format) => {
        const [rect, second] = found(format).rects
        if (!rect || second) throw new OfficeError('InvalidOperation', 'the format lies on several areas')
        return { sheet: format.sheet, rect }
      },
    },
    getRanges: {
      kind: () => RANGE_AREAS,
      find: (format): Places => ({ sheet: format.sheet, rects: found(format).rects }),
    },
  },
  acts: {
    delete: (format) => {
      for (const rect of found(format).rects) format.sheet.setBar(rect, null)
    },
  },
}

export const FORMATS: Kind<Place> = {
  name: 'ConditionalFormatCollection',
  list: {
    kind: () => FORMAT,
    read: ({ sheet, rect }) => sheet.bars(rect).map(({ id }): Format => ({ sheet, id })),
  },
  answers: { getCount: ({ sheet, rect }) => sheet.bars(rect).length },
  finds: {
    getItem: {
      kind: () => FORMAT,
      find: ({ sheet, rect }, id: string): Format | null =>
        sheet.bars(rect).some((bar) => bar.id === id) ? { sheet, id } : null,
    },
    add: {
      kind: () => FORMAT,
      writes: true,
      find: ({ sheet, rect }, type: string): Format => {
        if (type !== 'DataBar')
          throw new OfficeError('NotImplemented', `the desk has no conditional format of the kind ${type}`)
        const id = generateRandomId(12)
        // as the host begins one (from memory): from the lowest value to the highest, blue and fading
        sheet.setBar(rect, {
          id,
          lower: { type: 'Automatic' },
          upper: { type: 'Automatic' },
          fill: '#638EC6',
          border: '#638EC6',
          gradient: true,
          direction: 'Context',
        })
        return { sheet, id }
      },
    },
  },
  acts: { clearAll: ({ sheet, rect }) => sheet.setBar(rect, null) },
}
