import type { ReactNode } from 'react'
import { Link, makeStyles, mergeClasses, tokens } from '@fluentui/react-components'
import { ErrorCircle16Filled, Info16Regular, Warning16Filled, type FluentIcon } from '@fluentui/react-icons'
import { addressOf, parseAddress, sameArea, type Area, type Finding } from '../sheet'
import { useBooks } from './store'

const useStyles = makeStyles({
  link: {
    fontSize: 'inherit',
    lineHeight: 'inherit',
    overflowWrap: 'anywhere',
    textDecorationLine: 'underline',
    '@media (forced-colors: active)': { color: 'LinkText' },
  },
  list: { listStyleType: 'none', margin: 0, padding: 0, display: 'grid', rowGap: tokens.spacingVerticalXS },
  finding: {
    display: 'grid',
    gridTemplateColumns: '16px 1fr',
    columnGap: tokens.spacingHorizontalS,
    fontSize: tokens.fontSizeBase200,
    lineHeight: tokens.lineHeightBase200,
    overflowWrap: 'anywhere',
  },
  word: { fontWeight: tokens.fontWeightSemibold },
  stops: { color: tokens.colorStatusDangerForeground1 },
  warns: { color: tokens.colorStatusWarningForeground3 },
  notes: { color: tokens.colorNeutralForeground3 },
  extra: { '&:not(:empty)': { marginTop: tokens.spacingVerticalXXS } },
})

/** The address of an area; pressing it shows the cells. */
export function PlaceLink({ area }: { area: Area }) {
  const books = useBooks()
  const classes = useStyles()
  return (
    <Link as="button" className={classes.link} onClick={() => void books.reveal(area)}>
      {addressOf(area)}
    </Link>
  )
}

const ADDRESS = /(?:'(?:[^']|'')+'|[\p{L}_][\p{L}\p{N}_.]*)!\$?[A-Z]{1,3}\$?\d+(?::\$?[A-Z]{1,3}\$?\d+)?/gu

/**
 * A sentence in which every address is a link to its cells.
 * @param area where to look, added at the end when the sentence does not name it
 */
export function Sentence({ text, area = null }: { text: string; area?: Area | null }) {
  const parts: ReactNode[] = []
  let told = area === null
  let end = 0
  for (const match of text.matchAll(ADDRESS)) {
    const named = parseAddress(match[0])
    if (!named) continue
    parts.push(text.slice(end, match.index), <PlaceLink key={match.index} area={named} />)
    end = match.index + match[0].length
    told ||= sameArea(named, area)
  }
  return (
    <>
      {parts}
      {text.slice(end)}
      {!told && area && (
        <>
          {' '}
          <PlaceLink area={area} />
        </>
      )}
    </>
  )
}

const GRAVITY: {
  readonly [weight in Finding['weight']]: { readonly word: string; readonly Icon: FluentIcon }
} = {
  stops: { word: 'Stop', Icon: ErrorCircle16Filled },
  warns: { word: 'Warning', Icon: Warning16Filled },
  notes: { word: 'Note', Icon: Info16Regular },
}

type Gravity = Finding['weight']

export function GravityIcon({ weight }: { weight: Gravity }) {
  const classes = useStyles()
  const { Icon } = GRAVITY[weight]
  return <Icon className={classes[weight]} aria-hidden />
}

export function GravityWord({ weight }: { weight: Gravity }) {
  const classes = useStyles()
  return <span className={mergeClasses(classes.word, classes[weight])}>{GRAVITY[weight].word}.</span>
}

/** What was found while reading, each with its gravity as icon and word and a link to its cells. */
export function Findings({
  findings,
  label,
  after,
}: {
  findings: readonly Finding[]
  label: string
  /** what can be done about a finding */
  after?: (finding: Finding) => ReactNode
}) {
  const classes = useStyles()
  if (findings.length === 0) return null
  return (
    <ul className={classes.list} aria-label={label}>
      {findings.map((finding, index) => (
        <li key={index} className={classes.finding}>
          <GravityIcon weight={finding.weight} />
          <span>
            <GravityWord weight={finding.weight} /> <Sentence text={finding.sentence} area={finding.area} />
            {after && <div className={classes.extra}>{after(finding)}</div>}
          </span>
        </li>
      ))}
    </ul>
  )
}
