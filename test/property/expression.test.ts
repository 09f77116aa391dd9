import fc from 'fast-check'
import { all, create } from 'mathjs/number'
import type { Culture } from '../../src/sheet'
import { attempt } from '../../src/sheet'
import type { Expressions, RuleScope } from '../../src/sheet/expression'
import { loadExpressions, plainNumber } from '../../src/sheet/expression'

// Rules made up at random, as trees. Each is written down as a user would type it and worked out three times: by the module, by walking the tree
// here, which knows nothing of texts and precedence, and by mathjs's own evaluate (15.2.0) on a text with x/100 for x% and the truth of a
// comparison of labels in its place. All three take the same steps on the same numbers, so results are equal to the last bit.

const POINT: Culture = { decimal: '.', group: ',', dateOrder: 'mdy' }
const COMMA: Culture = { decimal: ',', group: '.', dateOrder: 'dmy' }

const math = create(all!, {})
const { equal, unequal, smaller, larger, smallerEq, largerEq } = math
const COMPARED = {
  '==': equal,
  '!=': unequal,
  '<': smaller,
  '>': larger,
  '<=': smallerEq,
  '>=': largerEq,
} as const

const FIGURES = ['weight', 'amount', 'risk_share', 'contribution', 'marginal', 'volatility', 'beta', 'limit', 'benchmark'] as const // prettier-ignore
const LABELS = ['Energy', 'energy', ' Water', 'Oil "heavy"', 'Énergie', ''] as const

type Figure = (typeof FIGURES)[number]
type Comparison = keyof typeof COMPARED

type Tree =
  | { kind: 'constant'; digits: string; percent: boolean }
  | { kind: 'figure'; name: Figure }
  | { kind: 'minus'; of: Tree }
  | { kind: 'arithmetic'; sign: '+' | '-' | '*' | '/'; left: Tree; right: Tree }
  | { kind: 'call'; name: 'min' | 'max' | 'abs'; args: Tree[] }
  | { kind: 'case'; condition: Truth; yes: Tree; no: Tree }
type Truth =
  | { kind: 'compare'; first: Tree; links: { sign: Comparison; tree: Tree }[] }
  | { kind: 'label'; sign: '==' | '!='; label: string; turned: boolean }
  | { kind: 'not'; of: Truth }
  | { kind: 'both'; word: 'and' | 'or'; left: Truth; right: Truth }

const { tree } = fc.letrec<{ tree: Tree; truth: Truth }>((tie) => ({
  tree: fc.oneof(
    { maxDepth: 4, depthIdentifier: 'rule' },
    fc.record({
      kind: fc.constant('constant' as const),
      digits: fc
        .tuple(fc.nat(300), fc.constantFrom('', '.5', '.05', '.125'))
        .map(([n, rest]) => `${n}${rest}`),
      percent: fc.boolean(),
    }),
    fc.record({ kind: fc.constant('figure' as const), name: fc.constantFrom(...FIGURES) }),
    fc.record({ kind: fc.constant('minus' as const), of: tie('tree') }),
    fc.record({
      kind: fc.constant('arithmetic' as const),
      sign: fc.constantFrom('+' as const, '-' as const, '*' as const, '/' as const),
      left: tie('tree'),
      right: tie('tree'),
    }),
    fc.oneof(
      fc.record({
        kind: fc.constant('call' as const),
        name: fc.constantFrom('min' as const, 'max' as const),
        args: fc.array(tie('tree'), { minLength: 2, maxLength: 3 }),
      }),
      fc.record({
        kind: fc.constant('call' as const),
        name: fc.constant('abs' as const),
        args: fc.array(tie('tree'), { minLength: 1, maxLength: 1 }),
      }),
    ),
    fc.record({
      kind: fc.constant('case' as const),
      condition: tie('truth'),
      yes: tie('tree'),
      no: tie('tree'),
    }),
  ) as fc.Arbitrary<Tree>,
  truth: fc.oneof(
    { maxDepth: 4, depthIdentifier: 'rule' },
    fc.record({
      kind: fc.constant('label' as const),
      sign: fc.constantFrom('==' as const, '!=' as const),
      label: fc.constantFrom(...LABELS),
      turned: fc.boolean(),
    }),
    fc.record({
      kind: fc.constant('compare' as const),
      first: tie('tree'),
      links: fc.oneof(
        fc.array(fc.record({ sign: fc.constantFrom<Comparison>('<', '<='), tree: tie('tree') }), { minLength: 1, maxLength: 2 }), // prettier-ignore
        fc.array(fc.record({ sign: fc.constantFrom<Comparison>('>', '>='), tree: tie('tree') }), { minLength: 1, maxLength: 2 }), // prettier-ignore
        fc.array(fc.record({ sign: fc.constantFrom<Comparison>('==', '!='), tree: tie('tree') }), { minLength: 1, maxLength: 1 }), // prettier-ignore
      ),
    }),
    fc.record({ kind: fc.constant('not' as const), of: tie('truth') }),
    fc.record({
      kind: fc.constant('both' as const),
      word: fc.constantFrom('and' as const, 'or' as const),
      left: tie('truth'),
      right: tie('truth'),
    }),
  ) as fc.Arbitrary<Truth>,
}))

const figure = fc.oneof(
  { weight: 6, arbitrary: fc.integer({ min: -400, max: 400 }).map((n) => n / 200) },
  { weight: 1, arbitrary: fc.constant(null) },
)
const scope: fc.Arbitrary<RuleScope> = fc.record({
  weight: fc.integer({ min: -400, max: 400 }).map((n) => n / 200),
  amount: figure,
  risk_share: figure,
  contribution: figure,
  marginal: figure,
  volatility: figure,
  beta: figure,
  limit: figure,
  benchmark: figure,
  group: fc.constantFrom(...LABELS, 'ENERGY ', 'water', null),
})

// ---- written down

/** How tightly what stands at the top of a part holds together; a part in a tighter place needs parentheses. */
const [CASE, OR, AND, COMPARE, SUM, PRODUCT, SIGN] = [0, 1, 2, 3, 4, 5, 6] as const

interface Style {
  readonly decimal: string
  readonly separator: string
  /** what stands between two signs */
  readonly gap: string
  readonly constant: (digits: string, percent: boolean) => string
  readonly label: (part: Extract<Truth, { kind: 'label' }>) => string
}

const quoted = (label: string): string => `"${label.replaceAll('"', '""')}"`
const typedIn = (decimal: string, separator: string, gap: string): Style => ({
  decimal,
  separator,
  gap,
  constant: (digits, percent) => digits.replace('.', decimal) + (percent ? '%' : ''),
  label: ({ sign, label, turned }) =>
    (turned ? [quoted(label), sign, 'group'] : ['group', sign, quoted(label)]).join(gap),
})

function written(part: Tree | Truth, style: Style, place: number = CASE): string {
  const { gap, separator } = style
  const at = (child: Tree | Truth, tightness: number) => written(child, style, tightness)
  const whole = (tightness: number, text: string) => (tightness < place ? `(${text})` : text)
  switch (part.kind) {
    case 'constant':
      return style.constant(part.digits, part.percent)
    case 'figure':
      return part.name
    case 'minus':
      return whole(SIGN, `-${at(part.of, SIGN)}`)
    case 'arithmetic': {
      const own = part.sign === '+' || part.sign === '-' ? SUM : PRODUCT
      return whole(own, [at(part.left, own), part.sign, at(part.right, own + 1)].join(gap))
    }
    case 'call':
      return `${part.name}(${part.args.map((arg) => at(arg, CASE)).join(`${separator} `)})`
    case 'case':
      return whole(CASE, [at(part.condition, OR), '?', at(part.yes, OR), ':', at(part.no, CASE)].join(gap))
    case 'compare':
      return whole(COMPARE, [at(part.first, SUM), ...part.links.flatMap(({ sign, tree }) => [sign, at(tree, SUM)])].join(gap)) // prettier-ignore
    case 'label':
      return whole(COMPARE, style.label(part))
    case 'not':
      return whole(SIGN, part.of.kind === 'not' ? `not ${at(part.of, SIGN)}` : `not (${at(part.of, CASE)})`)
    case 'both': {
      const own = part.word === 'and' ? AND : OR
      // words need their spaces
      return whole(own, `${at(part.left, own)} ${part.word} ${at(part.right, own + 1)}`)
    }
  }
}

// ---- worked out

/** The end of a walk without a number: the name or the sign it ended at. */
class Stopped extends Error {
  constructor(readonly at: string) {
    super(at)
  }
}

function numberOf(tree: Tree, holding: RuleScope): number {
  switch (tree.kind) {
    case 'constant':
      return Number(tree.digits) / (tree.percent ? 100 : 1)
    case 'figure': {
      const value = holding[tree.name]
      if (value === null) throw new Stopped(tree.name)
      return value
    }
    case 'minus':
      return -numberOf(tree.of, holding)
    case 'arithmetic': {
      const [a, b] = [numberOf(tree.left, holding), numberOf(tree.right, holding)]
      const value = { '+': a + b, '-': a - b, '*': a * b, '/': a / b }[tree.sign]
      if (!Number.isFinite(value)) throw new Stopped(tree.sign)
      return value
    }
    case 'call':
      return Math[tree.name](...(tree.args.map((arg) => numberOf(arg, holding)) as [number]))
    case 'case':
      return numberOf(isTrue(tree.condition, holding) ? tree.yes : tree.no, holding)
  }
}

const sameLabel = (a: string, b: string): boolean => a.trim().toLowerCase() === b.trim().toLowerCase()

function isTrue(truth: Truth, holding: RuleScope): boolean {
  switch (truth.kind) {
    case 'compare': {
      let left = numberOf(truth.first, holding)
      for (const { sign, tree } of truth.links) {
        const right = numberOf(tree, holding)
        if (!COMPARED[sign](left, right)) return false
        left = right
      }
      return true
    }
    case 'label':
      if (holding.group === null) throw new Stopped('group')
      return sameLabel(holding.group, truth.label) === (truth.sign === '==')
    case 'not':
      return !isTrue(truth.of, holding)
    case 'both': {
      const left = isTrue(truth.left, holding)
      return left === (truth.word === 'or') ? left : isTrue(truth.right, holding)
    }
  }
}

let expressions: Expressions
beforeAll(async () => {
  expressions = await loadExpressions()
})

const isShort = (text: string): boolean => text.length <= 500

it('a rule gives what its tree gives, to the last bit, or ends at the sign or the name where the tree ends', () => {
  fc.assert(
    fc.property(tree, scope, fc.constantFrom('', ' ', '  '), (rule, holding, gap) => {
      const text = written(rule, typedIn('.', ',', gap))
      fc.pre(isShort(text))
      const { value, fault } = attempt(() => expressions.read(text, POINT).evaluate(holding))
      try {
        const expected = numberOf(rule, holding)
        expect([text, fault?.message, value]).toEqual([text, undefined, expected + 0])
      } catch (stop) {
        if (!(stop instanceof Stopped)) throw stop
        expect([fault?.code, text.slice(fault?.where.column ?? 0).startsWith(stop.at)]).toEqual([
          'expression',
          true,
        ])
      }
    }),
  )
})

it("a rule gives what mathjs's own evaluation gives of the same text with x/100 for x%", () => {
  fc.assert(
    fc.property(tree, scope, (rule, holding) => {
      const text = written(rule, typedIn('.', ',', ' '))
      fc.pre(isShort(text))
      const { value } = attempt(() => expressions.read(text, POINT).evaluate(holding))
      // where there is no number, the tree above says why
      fc.pre(value !== undefined)
      const plain: Style = {
        ...typedIn('.', ',', ' '),
        constant: (digits, percent) => (percent ? `(${digits} / 100)` : digits),
        // whether it is asked for is up to the rule: a blank group is not looked at then
        label: ({ sign, label }) => String(sameLabel(holding.group ?? '', label) === (sign === '==')),
      }
      const figures = Object.fromEntries(FIGURES.map((name) => [name, holding[name] ?? 0]))
      expect([text, value]).toEqual([text, Number(math.evaluate(written(rule, plain), figures)) + 0])
    }),
  )
})

it('a rule means the same with a decimal comma, in capitals and in parentheses', () => {
  fc.assert(
    fc.property(tree, scope, (rule, holding) => {
      const text = written(rule, typedIn('.', ',', ' '))
      fc.pre(isShort(text))
      const outcome = (typed: string, culture: Culture) => {
        const { value, fault } = attempt(() => expressions.read(typed, culture).evaluate(holding))
        return [value, fault?.where.column, fault?.needed]
      }
      const expected = outcome(text, POINT)
      expect(outcome(written(rule, typedIn(',', ';', ' ')), COMMA)).toEqual(expected)
      expect(outcome(text.toUpperCase(), POINT)).toEqual(expected)
      // a number alone in parentheses is refused: it may stand for one below zero
      fc.pre(rule.kind !== 'constant' && text.length <= 498)
      expect(outcome(`(${text})`, POINT)[0]).toEqual(expected[0])
    }),
  )
})

it('a plain number is the same number as a rule', () => {
  fc.assert(
    fc.property(
      fc.double({ noNaN: true, noDefaultInfinity: true }),
      fc.constantFrom('', '%', ' %'),
      fc.constantFrom(POINT, COMMA),
      (number, percent, culture) => {
        const text = String(number).replace('.', culture.decimal) + percent
        const plain = plainNumber(text, culture)
        expect(plain).toEqual({ value: number / (percent === '' ? 1 : 100) + 0, percent: percent !== '' })
        const empty = Object.fromEntries(FIGURES.map((name) => [name, null])) as unknown as RuleScope
        expect(expressions.read(text, culture).evaluate(empty)).toBe(plain!.value)
      },
    ),
  )
})

it('any text whatever ends as a rule or as a fault with a place in it, and a rule as a number or such a fault', () => {
  const pieces = fc.constantFrom(
    ...FIGURES, 'group', 'min', 'max', 'abs', 'round', 'and', 'or', 'not', 'if', 'mod', 'constructor', '__proto__', 'this', 'true', 'i', 'end',
    '+', '-', '*', '/', '(', ')', ',', ';', '?', ':', '<', '>', '<=', '>=', '==', '!=', '=', '%', '^', '!', '.', '"', "'", '#', '[', ']', '{', '}', '&', '|',
    '1', '2.5', '2,5', '0.1', '.5', '1e3', '0x1', '"Energy"', '""', ' ', ' ', ' ', '\n', '\u2212', '\u0435', '\u200b', '\u{1d464}', '\ud800', '\\', '\\u0041',
  ) // prettier-ignore
  const text = fc.oneof(
    fc.array(pieces, { maxLength: 30 }).map((parts) => parts.join('')),
    fc.array(pieces, { maxLength: 30 }).map((parts) => parts.join(' ')),
    fc.string({ maxLength: 60 }),
    fc.string({ unit: 'binary', maxLength: 60 }),
  )
  fc.assert(
    fc.property(text, scope, fc.constantFrom(POINT, COMMA), (typed, holding, culture) => {
      const { value: rule, fault } = attempt(() => expressions.read(typed, culture))
      const end = rule ? attempt(() => rule.evaluate(holding)) : { value: undefined, fault }
      if (end.fault) {
        const { code, where } = end.fault
        expect([code, Number.isInteger(where.column)]).toEqual(['expression', true])
        expect(where.column).toBeGreaterThanOrEqual(0)
        expect(where.column).toBeLessThanOrEqual(typed.length)
      } else expect(Number.isFinite(end.value)).toBe(true)
    }),
  )
})

it('round gives decimals as they are rounded by hand, halves away from zero', () => {
  fc.assert(
    fc.property(
      fc.integer({ min: -1e9, max: 1e9 }),
      fc.integer({ min: 0, max: 9 }),
      fc.nat(9),
      (whole, places, keep) => {
        fc.pre(keep <= places)
        const unit = 10 ** (places - keep)
        // whole / 10^places in whole units of 10^-keep: integers throughout, so nothing is lost
        const units = Math.sign(whole) * Math.floor((Math.abs(whole) + unit / 2) / unit)
        const weight = Number(`${whole}e-${places}`)
        const empty = Object.fromEntries(FIGURES.map((name) => [name, null])) as unknown as RuleScope
        const rule = expressions.read(`round(weight, ${keep})`, POINT)
        expect(rule.evaluate({ ...empty, weight })).toBe(Number(`${units}e-${keep}`) + 0)
      },
    ),
  )
})
