import { Button, Field, Input, makeStyles, tokens } from '@fluentui/react-components'
import { countOf, type BooksState, type Breakdown, type CommitteeChoice } from '../sheet'
import { Choice, Disclosure } from './controls'
import { Remark } from './headline'
import { bandsOf } from './measure'
import { FaultLine, useStepStyles } from './step'
import { useBooks, useKept } from './store'

const useStyles = makeStyles({
  fields: {
    display: 'grid',
    gridTemplateColumns: '96px minmax(0, 1fr)',
    columnGap: tokens.spacingHorizontalM,
    alignItems: 'start',
  },
  input: { minWidth: 0, width: '100%' },
  list: {
    margin: 0,
    paddingLeft: tokens.spacingHorizontalL,
    fontSize: tokens.fontSizeBase200,
    lineHeight: tokens.lineHeightBase300,
  },
})

const PAPERS: readonly (readonly [CommitteeChoice['paper'], string])[] = [
  ['A4', 'A4'],
  ['Letter', 'Letter'],
]

/** Countries that print on Letter (Unicode CLDR, paper sizes by territory; from memory). */
const ON_LETTER = /-(?:BZ|CA|CL|CO|CR|GT|MX|NI|PA|PH|PR|SV|US|VE)$/i

/** Kept results that a line through time needs. */
const FEWEST_IN_TIME = 3

/** What the page holds, in its order. */
const contents = (
  { limits, active, byGroup, tails, ...breakdown }: Breakdown,
  { reporting: { kept }, checks }: BooksState,
): readonly string[] => [
  `Volatility${bandsOf({ ...breakdown, limits, active, byGroup, tails }) ? ' with its 95% band' : ''}${limits.length > 0 ? ', against its limits' : ''}`,
  ...(active ? ['Tracking error'] : []),
  ...(kept.length > 0 ? ['What changed since the last kept result'] : []),
  ...(limits.length > 0 ? [`${countOf(limits.length, 'limit')}, breaches first`] : []),
  'Largest contributors and risk-reducing positions, with a chart of weight against share of risk',
  ...(byGroup.length > 0 ? ['Contributions by group'] : []),
  'Concentration, leverage',
  ...(typeof tails === 'string' ? [] : ['Value at risk and expected shortfall']),
  ...(kept.length >= FEWEST_IN_TIME ? ['Risk through time, with a chart'] : []),
  ...(checks ? ['Data warnings'] : []),
  'Settings and the dates of the data',
]

/** What a committee expects there and the book does not have. */
function missing({ limits }: Breakdown, { reporting: { kept } }: BooksState): readonly string[] {
  return [
    ...(limits.length === 0 ? ['No limits are set (under Trades): the page shows risk without them.'] : []),
    ...(kept.length === 0
      ? [
          'No result is kept yet: the page cannot say what changed since the last one. Keep each result that a committee has seen.',
        ]
      : kept.length < FEWEST_IN_TIME
        ? [
            `Risk through time needs ${countOf(FEWEST_IN_TIME, 'kept result')}; ${kept.length === 1 ? '1 is' : `${kept.length} are`} kept.`,
          ]
        : []),
  ]
}

/** One printable page. */
export default function Committee({ state, breakdown }: { state: BooksState; breakdown: Breakdown }) {
  const books = useBooks()
  const classes = { ...useStepStyles(), ...useStyles() }
  const { faults, working, current } = state
  const [paper, setPaper] = useKept<CommitteeChoice['paper']>(
    'paper',
    ON_LETTER.test(navigator.language) ? 'Letter' : 'A4',
  )
  const [preparedBy, setPreparedBy] = useKept(`prepared by, ${current}`, '')
  const lacks = missing(breakdown, state)
  return (
    <>
      <p className={classes.small}>
        A sheet set up to be printed on one page: header and footer carry the book, the date of the data and
        the page. It stays as it is until it is written again.
      </p>
      <div className={classes.fields}>
        <Choice label="Paper" value={paper} choices={PAPERS} choose={setPaper} />
        <Field label="Prepared by" size="small">
          <Input
            size="small"
            className={classes.input}
            autoComplete="off"
            maxLength={80}
            value={preparedBy}
            onChange={(_, { value }) => setPreparedBy(value)}
          />
        </Field>
      </div>
      {lacks.map((line) => (
        <Remark key={line} text={line} />
      ))}
      <FaultLine text={faults.report} />
      <div className={classes.buttons}>
        <Button
          size="small"
          disabledFocusable={working !== null}
          onClick={() => void books.writeCommittee({ paper, preparedBy: preparedBy.trim() })}
        >
          Write page
        </Button>
      </div>
      <Disclosure summary="What it will hold" open={false}>
        <ul className={classes.list}>
          {contents(breakdown, state).map((line) => (
            <li key={line}>{line}</li>
          ))}
        </ul>
      </Disclosure>
    </>
  )
}
