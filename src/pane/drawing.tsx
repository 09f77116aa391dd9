import { makeStyles, tokens } from '@fluentui/react-components'
import { PatternLines } from '@visx/pattern'

/** What drawings have in common: figures along an axis, and the key that says what the marks mean. */
export const useDrawingStyles = makeStyles({
  axis: {
    fill: tokens.colorNeutralForeground2,
    fontSize: tokens.fontSizeBase100,
    fontVariantNumeric: 'tabular-nums',
    fontFamily: tokens.fontFamilyBase,
    '@media (forced-colors: active)': { fill: 'CanvasText' },
  },
  key: {
    display: 'flex',
    flexWrap: 'wrap',
    columnGap: tokens.spacingHorizontalM,
    fontSize: tokens.fontSizeBase200,
    lineHeight: tokens.lineHeightBase200,
    color: tokens.colorNeutralForeground2,
  },
  keyed: { display: 'inline-flex', alignItems: 'center', columnGap: tokens.spacingHorizontalXS },
})

const useStyles = makeStyles({ apart: { position: 'absolute', width: 0, height: 0 } })

/** Hatching that bars are filled with as `url(#id)`, so that they differ from solid ones in every theme; the class colours its lines. */
export function Hatch({ id, className }: { id: string; className: string }) {
  const classes = useStyles()
  return (
    <svg className={classes.apart} aria-hidden focusable="false">
      <PatternLines
        id={id}
        width={4}
        height={4}
        orientation={['diagonal']}
        strokeWidth={1.5}
        className={className}
      />
    </svg>
  )
}
