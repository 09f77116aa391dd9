import { useState } from 'react'
import { makeStyles, tokens } from '@fluentui/react-components'
import {
  numberText,
  percentText,
  scalesWithTime,
  type Breakdown,
  type TailChoice,
  type Tails,
} from '../sheet'
import { ConfidenceEntry, Choice, Entry, typedNumber } from './controls'
import { digitsFor, pointsText, sharesOf } from './measure'
import { NONE } from './positions'
import { useBooks } from './store'
import { Headline, Remark } from './headline'
import { FigureTable, Pairs, TieOut } from './table'

const useStyles = makeStyles({
  fields: {
    display: 'grid',
    gridTemplateColumns: 'minmax(0, 1fr) minmax(0, 1fr)',
    columnGap: tokens.spacingHorizontalM,
    rowGap: tokens.spacingVerticalS,
    alignItems: 'start',
  },
  wide: { gridColumn: '1 / -1' },
  text: { margin: 0, fontSize: tokens.fontSizeBase200, lineHeight: tokens.lineHeightBase200 },
})

type Kind = TailChoice['method']['kind']

const METHODS: readonly (readonly [Kind, string])[] = [
  ['historical', 'Historical (past returns)'],
  ['normal', 'Normal distribution'],
  ['student', 'Student’s t distribution'],
  ['cornish-fisher', 'Normal, corrected for skewness and kurtosis'],
]

const HINTS: { readonly [K in Kind]: string } = {
  historical: 'What these weights would have lost on each past date',
  normal: 'The volatility alone; shares equal shares of risk',
  student: 'Fatter tails than normal; shares equal shares of risk',
  'cornish-fisher': 'Cornish–Fisher expansion; value at risk only',
}

/** What is asked of the tail: method, confidence, horizon. */
function Fields({
  choice,
  fault,
  refusal,
}: {
  choice: TailChoice
  fault: string | undefined
  /** why there are no figures; it stands at the field that can mend it */
  refusal?: string
}) {
  const books = useBooks()
  const classes = useStyles()
  const choose = (change: Partial<TailChoice>): void => void books.choose({ tails: { ...choice, ...change } })
  const { method } = choice
  const scales = scalesWithTime(choice)
  const atHorizon = !scales && choice.periods !== 1
  return (
    <div className={classes.fields}>
      <div className={classes.wide}>
        <Choice
          label="Method"
          value={method.kind}
          choices={METHODS}
          hint={HINTS[method.kind]}
          fault={fault ?? (atHorizon ? undefined : refusal)}
          choose={(kind) => choose({ method: kind === 'student' ? { kind, degrees: null } : { kind } })}
        />
      </div>
      <ConfidenceEntry confidence={choice.confidence} commit={(confidence) => choose({ confidence })} />
      <Entry
        label="Horizon, periods"
        shown={String(choice.periods)}
        hint={scales ? 'Scales with the square root of time' : 'This method: 1'}
        fault={atHorizon ? refusal : undefined}
        read={(text) => {
          const value = typedNumber(text)
          return value !== null && value > 0 ? { value } : { needed: 'A number above 0 is needed.' }
        }}
        commit={(periods) => choose({ periods })}
      />
      {method.kind === 'student' && (
        <Entry<number | null>
          label="Degrees of freedom"
          shown={method.degrees === null ? '' : String(method.degrees)}
          hint="Empty: fitted"
          read={(text) => {
            if (text === '') return { value: null }
            const value = typedNumber(text)
            return value !== null && value > 2 ? { value } : { needed: 'A number above 2 is needed.' }
          }}
          commit={(degrees) => choose({ method: { kind: 'student', degrees } })}
        />
      )}
    </div>
  )
}

function Parts({ breakdown, tails }: { breakdown: Breakdown; tails: Tails }) {
  const [opened, setOpened] = useState<ReadonlySet<string | number>>(new Set())
  const { risk } = tails
  const { parts, shares } = risk
  if (!parts || !shares || risk.shortfall === null) return null
  const ofRisk = sharesOf(breakdown)
  const digits = digitsFor(breakdown.names.length)
  const order = [...parts.keys()].sort((a, b) => parts[b]! - parts[a]!)
  return (
    <>
      <FigureTable
        label="Shares of large losses"
        columns={[
          { head: 'Position', width: null },
          { head: 'Share of risk', width: 54 },
          { head: 'Share of expected shortfall', width: 72 },
          { head: 'Difference, points', width: 72 },
        ]}
        rows={order.map((i) => ({
          key: i,
          name: breakdown.names[i] ?? '',
          cells: [
            ofRisk ? percentText(ofRisk[i]!, digits) : NONE,
            percentText(shares[i]!, digits),
            ofRisk ? pointsText(shares[i]! - ofRisk[i]!, digits) : NONE,
          ],
          open: opened.has(i),
          details: () => (
            <Pairs
              pairs={[
                ['Weight', percentText(breakdown.decomposition.weights[i]!, digits)],
                ['Contribution to expected shortfall', percentText(parts[i]!, digits + 2)],
                ...(risk.valueAtRiskParts
                  ? [
                      [
                        'Contribution to value at risk',
                        percentText(risk.valueAtRiskParts[i]!, digits + 2),
                      ] as const,
                    ]
                  : []),
              ]}
            />
          ),
        }))}
        totals={[['Total', ofRisk ? percentText(1, digits) : NONE, percentText(1, digits), '']]}
        toggle={(key) => {
          const next = new Set(opened)
          if (!next.delete(key)) next.add(key)
          setOpened(next)
        }}
      />
      <TieOut
        parts="Contributions"
        sum={parts.reduce((sum, part) => sum + part, 0)}
        total="expected shortfall"
        whole={risk.shortfall}
      />
    </>
  )
}

/** Value at risk and expected shortfall, and what each position has of them. */
export default function LargeLosses({
  breakdown,
  choice,
  fault,
  capital,
}: {
  breakdown: Breakdown
  choice: TailChoice
  fault: string | undefined
  /** what the amounts of the holdings were divided by; null where they are weights */
  capital: number | null
}) {
  const classes = useStyles()
  const { tails } = breakdown
  if (typeof tails === 'string') return <Fields choice={choice} fault={fault} refusal={tails} />
  const { risk } = tails
  return (
    <>
      <Headline
        figures={[
          ['Value at risk', percentText(risk.valueAtRisk, 2)],
          ['Expected shortfall', risk.shortfall === null ? NONE : percentText(risk.shortfall, 2)],
        ]}
      />
      <p className={classes.text}>
        Losses as positive fractions of capital, {tails.label}. {tails.method}.
        {risk.standardError !== null &&
          ` Standard error of the value at risk ${percentText(risk.standardError, 2)}, ${tails.errorNote}.`}
      </p>
      {capital !== null && (
        <p className={classes.text}>
          Of the capital of {numberText(capital, 0)}: value at risk{' '}
          {numberText(risk.valueAtRisk * capital, 0)}
          {risk.shortfall !== null && `, expected shortfall ${numberText(risk.shortfall * capital, 0)}`}.
        </p>
      )}
      <Fields choice={choice} fault={fault} />
      {tails.partsWithheld === null ? (
        <>
          {tails.difference !== null && <p className={classes.text}>{tails.difference}</p>}
          <Parts breakdown={breakdown} tails={tails} />
        </>
      ) : (
        <Remark text={tails.partsWithheld} />
      )}
    </>
  )
}
