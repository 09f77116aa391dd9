/** Keeps the charts of the sheet in view drawn over its cells. */
import { CommandType, ICommandService, numfmt } from '@univerjs/core'
import { useEffect, useRef, useState, useSyncExternalStore } from 'react'
import { figuresAt, type Figure } from '../figures'
import type { Grid } from '../grid'
import { chartsOf, type SheetChart } from '../office'
import { ChartPicture, type DrawnChart } from './chart-picture'

/** How long a change waits to be drawn: many come at once, and what is kept with a sheet changes without a word from the grid. */
const PATIENCE = 200

/** What is drawn now, by the grid's id of the element that floats over its cells. */
class Pictures {
  readonly #charts = new Map<string, DrawnChart>()
  readonly #listeners = new Set<() => void>()

  readonly subscribe = (listener: () => void): (() => void) => {
    this.#listeners.add(listener)
    return () => this.#listeners.delete(listener)
  }

  at = (id: string): DrawnChart | undefined => this.#charts.get(id)

  set(id: string, chart: DrawnChart | null): void {
    if (JSON.stringify(chart) === JSON.stringify(this.#charts.get(id) ?? null)) return
    if (chart) this.#charts.set(id, chart)
    else this.#charts.delete(id)
    for (const listener of this.#listeners) listener()
  }
}

/** @returns how to stop */
export function drawCharts(grid: Grid): () => void {
  const { api, univer } = grid
  const pictures = new Pictures()
  const Picture = ({ floatDomId }: { floatDomId: string }) => <Sized pictures={pictures} id={floatDomId} />
  /** where each picture floats, and how to take it away */
  let floating = new Map<string, { readonly place: string; readonly remove: () => void }>()
  let drawn: { readonly sheet: string; readonly charts: readonly SheetChart[] } = { sheet: '', charts: [] }
  let isBehind = true

  function draw(): void {
    const book = api.getActiveWorkbook()
    const sheet = book?.getActiveSheet()
    if (!book || !sheet) return
    const now = {
      sheet: `${book.getId()} ${sheet.getSheetId()}`,
      charts: chartsOf(sheet.getSheet().getConfig()),
    }
    if (!isBehind && now.sheet === drawn.sheet && now.charts === drawn.charts) return
    isBehind = false
    const cells = sheet.getSheet()
    // the grid takes away what floats over a sheet that goes out of view
    if (now.sheet !== drawn.sheet) clear()
    drawn = now
    const kept = new Map<string, { readonly place: string; readonly remove: () => void }>()
    for (const chart of now.charts) {
      const id = `chart ${now.sheet} ${chart.name}`
      const { range, layout } = placeOf(
        chart,
        (row) => (cells.getRowVisible(row) ? cells.getRowHeight(row) : 0),
        (column) => (cells.getColVisible(column) ? cells.getColumnWidth(column) : 0),
      )
      const place = JSON.stringify([range, layout])
      pictures.set(id, drawnFrom(chart, grid))
      const known = floating.get(id)
      if (known?.place === place) {
        kept.set(id, known)
        floating.delete(id)
        continue
      }
      known?.remove()
      floating.delete(id)
      const layer = { componentKey: Picture, allowTransform: false, eventPassThrough: true }
      const float = sheet.addFloatDomToRange(sheet.getRange(range), layer, layout, id)
      if (float) kept.set(id, { place, remove: () => float.dispose() })
    }
    clear()
    floating = kept
  }

  function clear(): void {
    for (const [id, { remove }] of floating) {
      remove()
      pictures.set(id, null)
    }
    floating = new Map()
  }

  const following = univer
    .__getInjector()
    .get(ICommandService)
    .onCommandExecuted(({ type }) => {
      if (type === CommandType.MUTATION) isBehind = true
    })
  const timer = setInterval(draw, PATIENCE)
  return () => {
    clearInterval(timer)
    following.dispose()
    clear()
  }
}

/** The cells a chart lies over, and where within them. */
function placeOf(
  { from, to }: SheetChart,
  heightOf: (row: number) => number,
  widthOf: (column: number) => number,
) {
  const sum = (first: number, end: number, sizeOf: (line: number) => number): number =>
    Array.from({ length: Math.max(0, end - first) }, (_, k) => sizeOf(first + k)).reduce((a, b) => a + b, 0)
  // A little off the edges: what touches the last frozen row or column would be taken for a part of it.
  const [x, y] = [(from.x ?? 0) + 1, (from.y ?? 0) + 1]
  return {
    range: {
      startRow: from.row,
      startColumn: from.column,
      endRow: Math.max(from.row, to.y ? to.row : to.row - 1),
      endColumn: Math.max(from.column, to.x ? to.column : to.column - 1),
    },
    layout: {
      marginX: x,
      marginY: y,
      width: sum(from.column, to.column, widthOf) + (to.x ?? 0) - x - 1,
      height: sum(from.row, to.row, heightOf) + (to.y ?? 0) - y - 1,
    },
  }
}

function drawnFrom({ categories, series, ...chart }: SheetChart, grid: Grid): DrawnChart {
  const names = figuresAt(grid, categories).map(textOf)
  const { name, kind, title, format, reversed, legend } = chart
  return {
    ...{ name, kind, title, format, reversed, legend },
    categories: names,
    series: series.map(({ name: of, look, values }) => {
      const found = figuresAt(grid, values)
      return { name: of, look, values: names.map((_, k) => numberOf(found[k])) }
    }),
  }
}

const textOf = ({ value, format }: Figure): string =>
  typeof value === 'number' ? numfmt.format(format, value, { throws: false }) : (value ?? '')

const numberOf = (figure: Figure | undefined): number | null =>
  typeof figure?.value === 'number' ? figure.value : null

/** A picture as large as the place it is given. */
function Sized({ pictures, id }: { pictures: Pictures; id: string }) {
  const chart = useSyncExternalStore(pictures.subscribe, () => pictures.at(id))
  const place = useRef<HTMLDivElement>(null)
  const [size, setSize] = useState({ width: 0, height: 0 })
  useEffect(() => {
    const element = place.current
    if (!element) return
    const observer = new ResizeObserver(() =>
      setSize({ width: element.clientWidth, height: element.clientHeight }),
    )
    observer.observe(element)
    return () => observer.disconnect()
  }, [])
  return (
    <div ref={place} className="desk-chart-place">
      {chart && size.width > 0 && <ChartPicture chart={chart} {...size} />}
    </div>
  )
}
