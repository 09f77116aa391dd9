import { makeStyles, mergeClasses, tokens } from '@fluentui/react-components'
import { Sentence } from './place'

const useStyles = makeStyles({
  pair: { display: 'grid', gridTemplateColumns: '1fr 1fr', columnGap: tokens.spacingHorizontalL, margin: 0 },
  // The figure first, its label below: labels of one and two lines leave the two figures on one line.
  figure: { display: 'flex', flexDirection: 'column-reverse', justifyContent: 'flex-end', minWidth: 0 },
  label: {
    fontSize: tokens.fontSizeBase200,
    lineHeight: tokens.lineHeightBase200,
    color: tokens.colorNeutralForeground2,
  },
  value: {
    margin: 0,
    fontVariantNumeric: 'tabular-nums',
    fontWeight: tokens.fontWeightSemibold,
  },
  usual: { fontSize: tokens.fontSizeBase600, lineHeight: tokens.lineHeightBase600 },
  first: { fontSize: tokens.fontSizeHero800, lineHeight: tokens.lineHeightHero800 },
  // the smaller figure stands on the line of the larger
  beside: {
    fontSize: tokens.fontSizeBase600,
    lineHeight: `calc(${tokens.lineHeightHero800} - 5px)`,
    paddingTop: '5px',
  },
  remark: {
    margin: 0,
    padding: tokens.spacingHorizontalM,
    backgroundColor: tokens.colorNeutralBackground3,
    border: `1px solid ${tokens.colorTransparentStroke}`,
    fontSize: tokens.fontSizeBase200,
    lineHeight: tokens.lineHeightBase200,
  },
})

/** The figures a view or a section is about, two on a line; in a view the first leads. */
export function Headline({
  figures,
  leading = false,
}: {
  figures: readonly (readonly [label: string, value: string])[]
  leading?: boolean
}) {
  const classes = useStyles()
  return (
    <dl className={classes.pair}>
      {figures.map(([label, value], k) => (
        <div key={label} className={classes.figure}>
          <dt className={classes.label}>{label}</dt>
          <dd
            className={mergeClasses(
              classes.value,
              !leading ? classes.usual : k === 0 ? classes.first : classes.beside,
            )}
          >
            {value}
          </dd>
        </div>
      ))}
    </dl>
  )
}

/** Why something is not shown, in its place. */
export function Remark({ text }: { text: string }) {
  const classes = useStyles()
  return (
    <p className={classes.remark}>
      <Sentence text={text} />
    </p>
  )
}
