import { useMemo } from 'react'
import { makeStyles, tokens } from '@fluentui/react-components'
import { scaleLinear } from '@visx/scale'
import { countOf, dateText, percentText, type BacktestStudy } from '../sheet'
import { useDrawingStyles } from './drawing'
import { useWidth } from './width'

const useStyles = makeStyles({
  figure: { margin: 0, minWidth: 0 },
  drawing: { display: 'block', overflow: 'visible' },
  zero: {
    stroke: tokens.colorNeutralStroke1,
    '@media (forced-colors: active)': { stroke: 'CanvasText' },
  },
  returns: {
    fill: 'none',
    stroke: tokens.colorNeutralForeground3,
    '@media (forced-colors: active)': { stroke: 'CanvasText' },
  },
  forecast: {
    fill: 'none',
    stroke: tokens.colorBrandForeground1,
    strokeWidth: '1.5px',
    '@media (forced-colors: active)': { stroke: 'Highlight' },
  },
  exception: {
    fill: tokens.colorStatusDangerForeground1,
    stroke: tokens.colorNeutralBackground1,
    '@media (forced-colors: active)': { fill: 'CanvasText', stroke: 'Canvas' },
  },
})

const HEIGHT = 140
/** Room for the marks at the ends and the dates below. */
const MARGIN = { left: 34, right: 6, top: 4, bottom: 16 } as const
/** Half the width of the mark of an exception. */
const MARK = 3.5

/** A triangle that points down, its tip at the return. */
const markAt = (x: number, y: number): string => `M${x} ${y}l${-MARK} ${-2 * MARK}h${2 * MARK}z`

/** Returns against the band that was forecast for them, date by date; exceptions are marked with triangles. */
export default function Forecasts({ study }: { study: BacktestStudy }) {
  const classes = { ...useDrawingStyles(), ...useStyles() }
  const { element, width } = useWidth<HTMLDivElement>()
  const { result, dates } = study
  const { returns, valueAtRisk, exceptions } = result
  const drawn = useMemo(() => {
    const count = returns.length
    let low = 0
    let high = 0
    for (let t = 0; t < count; t++) {
      if (returns[t]! < low) low = returns[t]!
      if (returns[t]! > high) high = returns[t]!
      if (-valueAtRisk[t]! < low) low = -valueAtRisk[t]!
    }
    const across = scaleLinear<number>({
      domain: [0, Math.max(1, count - 1)],
      range: [MARGIN.left, Math.max(MARGIN.left + 1, width - MARGIN.right)],
    })
    const up = scaleLinear<number>({ domain: [low, high], range: [HEIGHT - MARGIN.bottom, MARGIN.top] })
    // one path for all dates: thousands of them are one element to draw
    let stems = ''
    let band = ''
    let marks = ''
    for (let t = 0; t < count; t++) {
      const x = across(t)
      if (!Number.isNaN(returns[t]!))
        stems += `M${x.toFixed(1)} ${up(0).toFixed(1)}V${up(returns[t]!).toFixed(1)}`
      if (!Number.isNaN(valueAtRisk[t]!))
        band += `${band === '' || Number.isNaN(valueAtRisk[t - 1] ?? NaN) ? 'M' : 'L'}${x.toFixed(1)} ${up(-valueAtRisk[t]!).toFixed(1)}`
      if (exceptions[t]) marks += markAt(x, up(Number.isNaN(returns[t]!) ? 0 : returns[t]!))
    }
    return { stems, band, marks, low, high, up }
  }, [returns, valueAtRisk, exceptions, width])
  const { low, high, up } = drawn
  const [first, last] = [dates?.[0], dates?.at(-1)]
  return (
    <figure className={classes.figure}>
      <div className={classes.key} aria-hidden>
        <span className={classes.keyed}>
          <svg width="10" height="10">
            <path className={classes.returns} d="M2 0v10M5 3v7M8 1v9" />
          </svg>
          Return
        </span>
        <span className={classes.keyed}>
          <svg width="20" height="10">
            <path className={classes.forecast} d="M0 5h20" />
          </svg>
          Value at risk forecast
        </span>
        <span className={classes.keyed}>
          <svg width="10" height="10">
            <path className={classes.exception} d={markAt(5, 9)} />
          </svg>
          Exception
        </span>
      </div>
      <div ref={element}>
        <svg
          className={classes.drawing}
          width="100%"
          height={HEIGHT}
          role="img"
          aria-label={`Returns of ${countOf(returns.length, 'date')} against the value at risk forecast for them; ${countOf(result.tests.exceptions, 'exception')}.`}
        >
          <line className={classes.zero} x1={MARGIN.left} x2={width - MARGIN.right} y1={up(0)} y2={up(0)} />
          <path className={classes.returns} d={drawn.stems} />
          <path className={classes.forecast} d={drawn.band} />
          <path className={classes.exception} d={drawn.marks} />
          <g className={classes.axis} textAnchor="end" aria-hidden>
            <text x={MARGIN.left - 4} y={up(high) + 8}>
              {percentText(high, 1)}
            </text>
            <text x={MARGIN.left - 4} y={up(0) + 3}>
              0
            </text>
            <text x={MARGIN.left - 4} y={up(low)}>
              {percentText(low, 1)}
            </text>
          </g>
          {typeof first === 'number' && typeof last === 'number' && (
            <g className={classes.axis} aria-hidden>
              <text x={MARGIN.left} y={HEIGHT - 2}>
                {dateText(first)}
              </text>
              <text x={width - MARGIN.right} y={HEIGHT - 2} textAnchor="end">
                {dateText(last)}
              </text>
            </g>
          )}
        </svg>
      </div>
    </figure>
  )
}
