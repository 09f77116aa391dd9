import { useId, useMemo } from 'react'
import { makeStyles, mergeClasses, tokens } from '@fluentui/react-components'
import { scaleLinear } from '@visx/scale'
import { Bar } from '@visx/shape'
import { changeSteps, percentText, type RiskChange } from '../sheet'
import { changeSentence, digitsOf } from './change-words'
import { Hatch, useDrawingStyles } from './drawing'
import { pointsText } from './measure'
import { useWidth } from './width'

const useStyles = makeStyles({
  figure: { margin: 0, minWidth: 0 },
  steps: { listStyleType: 'none', margin: 0, padding: 0 },
  step: {
    display: 'grid',
    gridTemplateColumns: '96px minmax(0, 1fr) 88px',
    columnGap: tokens.spacingHorizontalS,
    alignItems: 'center',
    fontSize: tokens.fontSizeBase200,
    lineHeight: tokens.lineHeightBase200,
    fontVariantNumeric: 'tabular-nums',
  },
  strong: { fontWeight: tokens.fontWeightSemibold },
  number: { textAlign: 'right', whiteSpace: 'nowrap' },
  drawing: { display: 'block', overflow: 'visible' },
  rise: {
    fill: tokens.colorBrandForeground1,
    stroke: tokens.colorBrandForeground1,
    '@media (forced-colors: active)': { fill: 'Highlight', stroke: 'Highlight' },
  },
  fall: {
    stroke: tokens.colorBrandForeground1,
    '@media (forced-colors: active)': { stroke: 'Highlight' },
  },
  level: {
    stroke: tokens.colorNeutralForeground1,
    strokeWidth: '3px',
    '@media (forced-colors: active)': { stroke: 'CanvasText' },
  },
  guide: {
    stroke: tokens.colorNeutralStrokeAccessible,
    strokeDasharray: '2 2',
    '@media (forced-colors: active)': { stroke: 'CanvasText' },
  },
})

/** Of a row, and of the bar in it. */
const HEIGHT = 26
const BAR = 14

/**
 * From the volatility before to the volatility after, cause by cause. Levels are places and not lengths, so that the picture need not begin
 * at 0: changes are small beside what they change.
 */
export default function Waterfall({ change }: { change: RiskChange }) {
  const classes = { ...useDrawingStyles(), ...useStyles() }
  const hatch = useId()
  const { element, width } = useWidth<HTMLDivElement>()
  const steps = useMemo(() => changeSteps(change), [change])
  const digits = digitsOf(change)
  const places = steps.flatMap(({ start, end }) => [start, end])
  const low = Math.min(...places)
  const high = Math.max(...places)
  const across = scaleLinear<number>({
    domain: high > low ? [low, high] : [low - 1, low + 1],
    range: [3, Math.max(4, width - 3)],
  })
  return (
    <figure className={classes.figure} aria-label={changeSentence(change)}>
      <Hatch id={hatch} className={classes.fall} />
      <div className={classes.key} aria-hidden>
        <span className={classes.keyed}>
          <svg width="8" height="12">
            <line className={classes.level} x1={4} x2={4} y1={0} y2={12} />
          </svg>
          Volatility
        </span>
        <span className={classes.keyed}>
          <svg width="24" height="10">
            <Bar className={classes.rise} x={0.5} y={0.5} width={23} height={9} />
          </svg>
          Rise
        </span>
        <span className={classes.keyed}>
          <svg width="24" height="10">
            <Bar className={classes.fall} fill={`url(#${hatch})`} x={0.5} y={0.5} width={23} height={9} />
          </svg>
          Fall
        </span>
      </div>
      <ol className={classes.steps}>
        {steps.map(({ label, start, end, isLevel }, k) => (
          <li key={label} className={mergeClasses(classes.step, isLevel && classes.strong)}>
            <span>{label}</span>
            <div ref={k === 0 ? element : null}>
              <svg className={classes.drawing} width="100%" height={HEIGHT} aria-hidden focusable="false">
                {k < steps.length - 1 && (
                  <line
                    className={classes.guide}
                    x1={across(end)}
                    x2={across(end)}
                    y1={HEIGHT / 2}
                    y2={1.5 * HEIGHT}
                  />
                )}
                {isLevel ? (
                  <line className={classes.level} x1={across(end)} x2={across(end)} y1={3} y2={HEIGHT - 3} />
                ) : (
                  <Bar
                    className={end < start ? classes.fall : classes.rise}
                    {...(end < start ? { fill: `url(#${hatch})` } : {})}
                    x={Math.min(across(start), across(end))}
                    width={Math.abs(across(end) - across(start))}
                    y={(HEIGHT - BAR) / 2}
                    height={BAR}
                  />
                )}
              </svg>
            </div>
            <span className={classes.number}>
              {isLevel ? percentText(end, digits) : `${pointsText(end - start, digits)} points`}
            </span>
          </li>
        ))}
      </ol>
    </figure>
  )
}
