import { Fault } from '../core'
import type { Culture } from './cells'
import { plainName, UNASSIGNED } from './names'
import { quote } from './wording'

/** What a rule can name of a holding, and what each name means; figures are those of the sheet's weights, scaled as the breakdown is. */
export const RULE_NAMES = {
  weight: 'weight in the sheet, as a share of capital',
  amount: 'amount in the sheet',
  risk_share: 'share of risk: contribution to risk over the total',
  contribution: 'contribution to risk',
  marginal: 'marginal contribution to risk',
  volatility: 'volatility of the holding alone, for a weight of 100%',
  beta: 'beta to portfolio',
  limit: 'number in the limit column',
  benchmark: 'benchmark weight',
  group: 'label in the first group column; compared with text in double quotes, by == or !=',
} as const

/** What a rule can call, by name. */
export const RULE_FUNCTIONS = {
  min: 'the smallest of two or more numbers',
  max: 'the largest of two or more numbers',
  abs: 'a number without its sign',
  round: 'a number to so many digits after the decimal point, halves away from zero',
} as const

export type RuleName = keyof typeof RULE_NAMES
type FunctionName = keyof typeof RULE_FUNCTIONS

/** One holding as a rule sees it; null where there is no such figure. A blank label in a group column is ''. */
export type RuleScope = {
  readonly [name in Exclude<RuleName, 'weight' | 'group'>]: number | null
} & {
  readonly weight: number
  readonly group: string | null
  /** its name, for the sentence of a fault */
  readonly holding?: string
}

/** A rule that has been read, ready for one holding after another. */
export interface Rule {
  /** the names it uses, in the order they are typed */
  readonly names: readonly RuleName[]
  /** the labels it compares `group` with, and where each stands, so that one which no holding carries can be told */
  readonly labels: readonly { readonly label: string; readonly column: number }[]
  /**
   * The number the rule gives for a holding. Only what the holding's own case needs is looked at: the other side of a `? :` may be blank.
   *
   * @throws Fault "expression"  a name without a value, a divisor of 0 or a result beyond any number, with its place
   */
  evaluate(scope: RuleScope): number
}

export interface Expressions {
  /**
   * Reads a rule for a holding's weight: numbers, names, `+ - * /`, comparisons, `and or not`, `condition ? a : b` and functions.
   * `2%` is 2/100 wherever it stands, so `weight - 2%` takes two points of capital away. Names count in any case.
   *
   * @param culture  with a decimal comma, arguments are parted by ; as in the workbook's own formulas
   * @throws Fault "expression"  `where.column`: the place in the text, from 0; behind its last sign where it ends too early
   * @cost up to LONGEST characters, parentheses up to DEEPEST deep: under a millisecond, once warm
   */
  read(text: string, culture: Culture): Rule
}

/** Bounds of a rule: nothing that a person types comes near them, and the parser's recursion stays far from the stack's end. */
const LONGEST = 500
const DEEPEST = 32

/**
 * Loads what reads rules. The parser is a chunk of its own, which nobody waits for who types plain numbers.
 *
 * mathjs finds the structure of a text alone. What stands at its leaves comes from the tokens, each node has to read back
 * as the tokens that were typed, and the steps that compute are this module's own: mathjs never evaluates anything.
 */
export async function loadExpressions(): Promise<Expressions> {
  const { create, parseDependencies } = await import('mathjs/number')
  const { parse } = create(parseDependencies!)
  return { read: (text, culture) => readRule(text, culture, (code) => parse(code) as unknown as Node) }
}

/**
 * A number or a percentage and nothing else, as a rule would read it: null for any other text.
 *
 * @example plainNumber('-2.5 %', { decimal: '.', group: ',', dateOrder: 'mdy' }) // {"value": -0.025, "percent": true}
 * @example plainNumber('weight', { decimal: '.', group: ',', dateOrder: 'mdy' }) // null
 */
export function plainNumber(
  text: string,
  { decimal }: Culture,
): { readonly value: number; readonly percent: boolean } | null {
  const match = /^[\p{Zs}\t]*(-?)[\p{Zs}\t]*([\d.,]+(?:e[-+]?\d+)?)[\p{Zs}\t]*(%?)[\p{Zs}\t]*$/iu.exec(text)
  if (!match) return null
  const size = numberIn(match[2] ?? '', decimal)
  if (size === null) return null
  const percent = match[3] === '%'
  // + 0, here as in a rule: a minus zero would be shown as one
  return { value: (match[1] === '-' ? -size : size) / (percent ? 100 : 1) + 0, percent }
}

// ---- the text, as tokens

interface Token {
  readonly kind: 'number' | 'name' | 'function' | 'text' | 'sign'
  /** where it begins in the text */
  readonly column: number
  readonly typed: string
  /** what the parser is given in its place, never longer than what was typed, so that places stay the same */
  readonly code: string
  /** of a number, its value, percent sign and all; of a text, what stands between the quotes */
  readonly value?: number | string
}

const NUMBER = /\d(?:\d|[.,](?=\d))*(?:e[-+]?\d+)?|\.\d+(?:[.,]\d+)*(?:e[-+]?\d+)?/iy
const COMMA_FIRST = /,\d+(?:e[-+]?\d+)?/iy
const PERCENT = /[\p{Zs}\t]*%/uy
const SPACE = /[\p{Zs}\t]+/uy
const WORD = /[\p{L}_][\p{L}\p{M}\p{N}_]*/uy
const TEXT = /"(?:[^"\r\n]|"")*"/y
const SIGN = /[=!<>]=|[-+*/()?:,;]|[<>](?!>)/y

const WORDS_BETWEEN = new Set(['and', 'or', 'not'])

/** What people type out of habit, or what a text processor makes of it, with what a rule has instead. The first that fits counts. */
const INSTEAD: readonly (readonly [typed: RegExp, needed: string])[] = [
  [/^<>/, '!= is needed for “not equal”'],
  [/^=/, '== is needed to compare'],
  [/^&&?/, '“and” is needed'],
  [/^\|\|?/, '“or” is needed'],
  [/^!/, '“not”, or != between two values, is needed'],
  [/^\^/, 'a product is needed: powers are no part of a rule'],
  [/^%/, 'a number is needed right before it, as in 2%: it means hundredths, never a remainder'],
  [/^['‘’`´“”„«»]/u, 'double quotes (") are needed around text, at both ends'],
  [/^"/, 'a second " is needed where the text ends'],
  [/^[−–—‐‑﹣－]/u, 'the minus sign of the keyboard (-) is needed'],
  [/^[×·⋅∗✕＊]/u, '* is needed'],
  [/^[÷∕⁄／]/u, '/ is needed'],
  [/^≤/u, '<= is needed'],
  [/^≥/u, '>= is needed'],
  [/^≠/u, '!= is needed'],
  [/^[\r\n\u2028\u2029]/u, 'a rule stands on one line'],
]

const faultAt = (column: number, found: string, needed: string): Fault =>
  new Fault('expression', found, needed, { column })

/** A character as it can be told: by its number too, where it could be taken for another one, or cannot be seen. */
function shown(character: string): string {
  if (/^[\x20-\x7e]$/.test(character)) return quote(character)
  const code = `U+${(character.codePointAt(0) ?? 0).toString(16).toUpperCase().padStart(4, '0')}`
  if (/[\r\n\u2028\u2029]/u.test(character)) return 'a line break'
  if (/[‘’“”„]/u.test(character)) return `a curved quotation mark (${code})`
  return /[\p{C}\p{Z}\p{M}]/u.test(character)
    ? `an unseen character (${code})`
    : `${quote(character)} (${code})`
}

/** The value of digits as a culture writes them, without grouping; null where they are none. */
function numberIn(typed: string, decimal: string): number | null {
  const plain = decimal === '.' ? typed : typed.replaceAll('.', ' ').replace(decimal, '.')
  if (!/^(?:\d+(?:\.\d+)?|\.\d+)(?:e[-+]?\d+)?$/i.test(plain)) return null
  const value = Number(plain)
  return Number.isFinite(value) ? value : null
}

function numberToken(typed: string, percent: string, column: number, decimal: string): Token {
  const value = numberIn(typed, decimal)
  if (value === null) {
    if (typed.includes(decimal === ',' ? '.' : ',')) {
      throw faultAt(
        column,
        `found ${quote(typed)}, which can be read in more than one way`,
        decimal === ','
          ? 'a comma is needed before decimals, and no mark between thousands'
          : 'a point is needed before decimals, no mark between thousands, and a space after a comma between arguments',
      )
    }
    if (Number(typed.replace(decimal, '.')) === Infinity)
      throw faultAt(column, `${quote(typed)} is too large`, 'a smaller number is needed')
    throw faultAt(column, `${quote(typed)} is no number`, 'digits with one decimal mark at most are needed')
  }
  const code = typed.replace(decimal, '.')
  return { kind: 'number', column, typed: typed + percent, code, value: percent === '' ? value : value / 100 }
}

function wordToken(typed: string, column: number, isCalled: boolean): Token {
  const code = typed.toLowerCase()
  for (let k = 0; k < typed.length;) {
    const character = String.fromCodePoint(typed.codePointAt(k) ?? 0)
    if (!/^\w$/.test(character))
      throw faultAt(
        column + k,
        `${shown(character)} in ${quote(typed)}`,
        'names are of plain letters (a to z) and underscores',
      )
    k += character.length
  }
  if (WORDS_BETWEEN.has(code)) return { kind: 'sign', column, typed, code }
  if (Object.hasOwn(RULE_FUNCTIONS, code)) return { kind: 'function', column, typed, code }
  if (Object.hasOwn(RULE_NAMES, code) && !isCalled) return { kind: 'name', column, typed, code }
  if (code === 'if')
    throw faultAt(column, `found ${quote(typed)}`, 'condition ? one number : other number is needed')
  throw isCalled
    ? faultAt(column, `${quote(typed)} is no function of a rule`, `the functions are ${FUNCTIONS}`)
    : faultAt(column, `${quote(typed)} is no name in a rule`, `the names are ${NAMES}`)
}

const inWords = (words: object): string =>
  Object.keys(words)
    .join(', ')
    .replace(/, (?=\w+$)/, ' and ')
const FUNCTIONS = inWords(RULE_FUNCTIONS)
const NAMES = inWords(RULE_NAMES)

/** Cuts a text into tokens; whatever is no part of a rule ends here, so that the parser never sees it. */
function tokensOf(text: string, culture: Culture): Token[] {
  const tokens: Token[] = []
  let column = 0
  const next = (pattern: RegExp): string => {
    pattern.lastIndex = column
    const found = pattern.exec(text)?.[0] ?? ''
    column += found.length
    return found
  }
  for (next(SPACE); column < text.length; next(SPACE)) {
    const start = column
    const rest = text.slice(start)
    let typed: string
    // a comma between two values is a wrong separator, not the beginning of a number
    const number =
      culture.decimal === ',' && !endsValue(tokens.at(-1)) && text[start] === ',' ? COMMA_FIRST : NUMBER
    if ((typed = next(number))) tokens.push(numberToken(typed, next(PERCENT), start, culture.decimal))
    else if ((typed = next(WORD)))
      tokens.push(wordToken(typed, start, /^[\p{Zs}\t]*\(/u.test(text.slice(column))))
    else if ((typed = next(TEXT))) {
      const value = typed.slice(1, -1).replaceAll('""', '"')
      // labels may hold anything: the parser is told only that a text stands here
      tokens.push({ kind: 'text', column: start, typed, code: `"${'x'.repeat(typed.length - 2)}"`, value })
    } else if ((typed = next(SIGN))) tokens.push(signToken(typed, start, culture.decimal))
    else if (rest.startsWith('=') && tokens.length === 0)
      throw faultAt(start, 'found “=” at the beginning', 'a rule begins without it')
    else {
      const [pattern, needed] = INSTEAD.find(([pattern]) => pattern.test(rest)) ?? [
        null,
        'numbers, names, text in double quotes, + - * / ( ) ? : and comparisons are what a rule is made of',
      ]
      const found = pattern?.exec(rest)?.[0] ?? String.fromCodePoint(text.codePointAt(start) ?? 0)
      throw faultAt(start, `found ${/^[!-~]+$/.test(found) ? quote(found) : shown(found)}`, needed)
    }
  }
  return tokens
}

function signToken(typed: string, column: number, decimal: string): Token {
  const separator = decimal === ',' ? ';' : ','
  if ((typed === ',' || typed === ';') && typed !== separator)
    throw faultAt(
      column,
      `found ${quote(typed)}`,
      decimal === ','
        ? 'a ; is needed between arguments, and digits on both sides of a decimal comma'
        : 'a comma is needed between arguments',
    )
  return { kind: 'sign', column, typed, code: typed === ';' ? ',' : typed }
}

const endsValue = (token: Token | undefined): boolean =>
  token !== undefined && (token.code === ')' || !['sign', 'function'].includes(token.kind))
const beginsValue = (token: Token): boolean =>
  token.code === '(' || token.code === 'not' || token.kind !== 'sign'

/**
 * What the parser would read in a way of its own, or could only report at the end of the text: values side by side (a product to it),
 * signs before a value, parentheses and what parts arguments.
 */
function checkNeighbours(tokens: readonly Token[], separator: string): void {
  const open: { readonly token: Token; readonly call: boolean }[] = []
  tokens.forEach((token, k) => {
    const before = tokens[k - 1]
    const { code, column, typed } = token
    if (before && endsValue(before) && beginsValue(token)) {
      const percent = before.kind === 'number' && before.typed.endsWith('%')
      throw faultAt(
        column,
        `${quote(before.typed)} and ${quote(typed)} stand side by side`,
        percent
          ? 'an operator is needed between them: % means hundredths, never a remainder'
          : 'an operator such as * is needed between them',
      )
    }
    if (token.kind === 'function' && tokens[k + 1]?.code !== '(')
      throw faultAt(
        column,
        `${quote(typed)} without arguments`,
        `parentheses are needed behind it, as in min(weight${separator} 5%)`,
      )
    if (code === '+' && !endsValue(before))
      throw faultAt(
        column,
        'found “+” with nothing before it',
        'a number is needed on both sides, as in weight + 2%',
      )
    if (code === '(') {
      if (open.length === DEEPEST)
        throw faultAt(column, `parentheses more than ${DEEPEST} deep`, 'a simpler rule is needed')
      open.push({ token, call: before?.kind === 'function' })
    } else if (code === ')') {
      if (!open.pop()) throw faultAt(column, 'found “)” without a “(” before it', 'they are needed in pairs')
    } else if (code === ',' && !open.at(-1)?.call)
      throw faultAt(
        column,
        `found ${quote(typed)} outside a function`,
        `it parts the arguments of ${FUNCTIONS} only`,
      )
  })
  const unclosed = open.at(-1)
  if (unclosed)
    throw faultAt(unclosed.token.column, 'found “(” that is not closed', 'a “)” is needed behind it')
  if (tokens.length === 3 && tokens[0]?.code === '(' && tokens[1]?.kind === 'number')
    throw faultAt(
      0,
      'found a number in parentheses, which can mean one below zero',
      `${tokens[1].typed} or -${tokens[1].typed} is needed`,
    )
}

// ---- the parser's tree, as steps

/** The kinds of node that are let through, as far as they are looked at. */
type Node =
  | { readonly type: 'ConstantNode' | 'SymbolNode' }
  | { readonly type: 'ParenthesisNode'; readonly content: Node }
  | { readonly type: 'OperatorNode'; readonly op: string; readonly args: readonly Node[] }
  | { readonly type: 'RelationalNode'; readonly params: readonly Node[] }
  | { readonly type: 'FunctionNode'; readonly args: readonly Node[] }
  | {
      readonly type: 'ConditionalNode'
      readonly condition: Node
      readonly trueExpr: Node
      readonly falseExpr: Node
    }
  | { readonly type: 'RangeNode' }

type Quantity = (scope: RuleScope) => number
type Condition = (scope: RuleScope) => boolean

/** What a part of a rule stands for, and the place a sentence about it points at. */
type Meaning = { readonly column: number } & (
  | { readonly kind: 'number'; readonly of: Quantity }
  | { readonly kind: 'condition'; readonly of: Condition }
  | { readonly kind: 'label'; readonly of: (scope: RuleScope) => string; readonly typed: string | null }
)

function readRule(text: string, culture: Culture, parse: (code: string) => Node): Rule {
  if (text.length > LONGEST)
    throw faultAt(LONGEST, `a rule of ${text.length} characters`, `one of ${LONGEST} at most is needed`)
  const tokens = tokensOf(text, culture)
  if (tokens.length === 0)
    throw faultAt(0, 'nothing is typed', 'a number or a rule is needed, such as weight - 2%')
  checkNeighbours(tokens, culture.decimal === ',' ? ';' : ',')
  const code = tokens.reduce((line, token) => line.padEnd(token.column) + token.code, '')
  const { meaning, labels } = meaningOf(parsed(code, tokens, parse), tokens)
  const result = numberOf(meaning)
  const names = tokens.flatMap((token) => (token.kind === 'name' ? [token.code as RuleName] : []))
  return { names: [...new Set(names)], labels, evaluate: (scope) => result(scope) + 0 }
}

/** The parser's tree, or a fault where it finds none: a value missing, or half of a `? :`. */
function parsed(code: string, tokens: readonly Token[], parse: (code: string) => Node): Node {
  try {
    return parse(code)
  } catch (error) {
    if (!(error instanceof SyntaxError)) throw error
    const { char } = error as SyntaxError & { readonly char: number }
    const at = tokens.findIndex(({ column }) => column >= char - 1)
    const token = tokens[at]
    const found = token ? `found ${quote(token.typed)}` : 'the rule ends here'
    throw faultAt(
      token?.column ?? code.length,
      found,
      endsValue(at < 0 ? tokens.at(-1) : tokens[at - 1])
        ? 'a “:” and the number for the other case are needed, an inner ? : in parentheses'
        : 'a number, a name or “(” is needed',
    )
  }
}

/** Turns the tree into steps, reading it beside the tokens: every node must stand for exactly what was typed. */
function meaningOf(root: Node, tokens: readonly Token[]) {
  const labels: { label: string; column: number }[] = []
  let read = 0

  /** the next token, which must be one of these kinds, or this sign */
  const take = (...expected: string[]): Token => {
    const token = tokens[read]
    if (!token || !expected.includes(token.kind === 'sign' ? token.code : token.kind))
      throw token
        ? faultAt(
            token.column,
            `${quote(token.typed)} has no meaning here`,
            'a number, a name or “(” is needed',
          )
        : faultAt((tokens.at(-1)?.column ?? 0) + 1, 'the rule ends here', 'more of it is needed')
    read++
    return token
  }

  const visit = (node: Node): Meaning => {
    switch (node.type) {
      case 'ConstantNode':
      case 'SymbolNode':
        return leaf(take('number', 'text', 'name'))
      case 'ParenthesisNode': {
        take('(')
        const meaning = visit(node.content)
        take(')')
        return meaning
      }
      case 'OperatorNode': {
        const [first, second] = node.args
        if (first && !second) return ahead(take('-', 'not'), visit(first))
        if (!first || !second) break
        const left = visit(first)
        const sign = take(...Object.keys(ARITHMETIC), ...Object.keys(COMPARISONS), 'and', 'or')
        return between(left, sign, visit(second))
      }
      case 'RelationalNode': {
        const links: { sign: Token; meaning: Meaning }[] = []
        const [first, ...others] = node.params
        if (!first) break
        const meaning = visit(first)
        for (const other of others)
          links.push({ sign: take(...Object.keys(COMPARISONS)), meaning: visit(other) })
        return chain(meaning, links)
      }
      case 'ConditionalNode': {
        const condition = conditionOf(visit(node.condition))
        const { column } = take('?')
        const yes = numberOf(visit(node.trueExpr))
        take(':')
        const no = numberOf(visit(node.falseExpr))
        return { kind: 'number', column, of: (scope) => (condition(scope) ? yes(scope) : no(scope)) }
      }
      case 'FunctionNode': {
        const token = take('function')
        take('(')
        const args = node.args.map((arg, k) => {
          if (k > 0) take(',')
          return numberOf(visit(arg))
        })
        take(')')
        return call(token, args)
      }
      case 'RangeNode':
        break
    }
    const colon = tokens.find(({ code }, k) => k >= read && code === ':')
    throw faultAt(
      colon?.column ?? tokens[read]?.column ?? 0,
      'found a “:” that belongs to no “?”',
      'condition ? one number : other number is needed, an inner one in parentheses',
    )
  }

  const leaf = ({ kind, code, value, typed, column }: Token): Meaning => {
    if (kind === 'number') {
      const constant = Number(value)
      return { kind: 'number', column, of: () => constant }
    }
    if (kind === 'text') {
      const label = String(value)
      labels.push({ label, column })
      return { kind: 'label', column, of: () => label, typed }
    }
    const name = code as RuleName
    if (name === 'group')
      return {
        kind: 'label',
        column,
        of: (scope) => scope.group ?? missing(name, scope, column),
        typed: null,
      }
    return {
      kind: 'number',
      column,
      of: (scope) => {
        const figure = scope[name]
        return figure !== null && Number.isFinite(figure) ? figure : missing(name, scope, column)
      },
    }
  }

  const meaning = visit(root)
  // what is left over belongs to no node
  if (read < tokens.length) take()
  return { meaning, labels }
}

const whose = ({ holding }: RuleScope): string => (holding === undefined ? 'this holding' : quote(holding))

function missing(name: RuleName, scope: RuleScope, column: number): never {
  throw faultAt(
    column,
    `${name} of ${whose(scope)} has no value`,
    `the rule needs a ${name === 'group' ? 'label' : 'number'} there`,
  )
}

function numberOf(meaning: Meaning): Quantity {
  if (meaning.kind === 'number') return meaning.of
  throw meaning.kind === 'condition'
    ? faultAt(
        meaning.column,
        'a condition stands where a number belongs',
        'condition ? one number : other number is needed',
      )
    : faultAt(
        meaning.column,
        `${meaning.typed === null ? 'group' : `the text ${meaning.typed}`} stands where a number belongs`,
        'group and text are needed on the two sides of == or !=, and nowhere else',
      )
}

function conditionOf(meaning: Meaning): Condition {
  if (meaning.kind === 'condition') return meaning.of
  throw faultAt(
    meaning.column,
    'found a value where a condition belongs',
    'a comparison such as weight > 5% is needed',
  )
}

const ARITHMETIC: Readonly<Record<string, (a: number, b: number) => number>> = {
  '+': (a, b) => a + b,
  '-': (a, b) => a - b,
  '*': (a, b) => a * b,
  '/': (a, b) => a / b,
}

/**
 * Figures come out of sums whose last digits are chance, so numbers that agree to 12 digits count as equal: a weight of 0.1 + 0.2 meets a
 * limit of 30%. Beside zero, what is under 1e-15 is zero. The parser's library compares in the same way.
 */
const same = (a: number, b: number): boolean =>
  Math.abs(a - b) <= Math.max(1e-12 * Math.max(Math.abs(a), Math.abs(b)), 1e-15)

const COMPARISONS: Readonly<Record<string, (a: number, b: number) => boolean>> = {
  '==': same,
  '!=': (a, b) => !same(a, b),
  '<': (a, b) => a < b && !same(a, b),
  '>': (a, b) => a > b && !same(a, b),
  '<=': (a, b) => a <= b || same(a, b),
  '>=': (a, b) => a >= b || same(a, b),
}

/** A sign before a value. */
function ahead({ code, column }: Token, meaning: Meaning): Meaning {
  if (code === '-') {
    const of = numberOf(meaning)
    return { kind: 'number', column, of: (scope) => -of(scope) }
  }
  if (meaning.kind !== 'condition')
    throw faultAt(
      column,
      'found “not” before a value',
      'a condition in parentheses is needed behind it, as in not (weight > 5%)',
    )
  const { of } = meaning
  return { kind: 'condition', column, of: (scope) => !of(scope) }
}

/** A sign between two parts. */
function between(left: Meaning, sign: Token, right: Meaning): Meaning {
  const { code, column } = sign
  if (code === 'and' || code === 'or') {
    const [a, b] = [conditionOf(left), conditionOf(right)]
    const of: Condition = code === 'and' ? (scope) => a(scope) && b(scope) : (scope) => a(scope) || b(scope)
    return { kind: 'condition', column, of }
  }
  const compute = ARITHMETIC[code]
  if (!compute) return chain(left, [{ sign, meaning: right }])
  const [a, b] = [numberOf(left), numberOf(right)]
  const of: Quantity = (scope) => {
    const [x, y] = [a(scope), b(scope)]
    if (code === '/' && y === 0)
      throw faultAt(
        column,
        `the divisor is 0 for ${whose(scope)}`,
        'another one, or a condition that keeps it from being 0, is needed',
      )
    const result = compute(x, y)
    if (!Number.isFinite(result))
      throw faultAt(
        column,
        `the result for ${whose(scope)} is larger than any number`,
        'smaller numbers are needed',
      )
    return result
  }
  return { kind: 'number', column, of }
}

/** A comparison, or several in a row that go one way: 1% < weight <= 5%. */
function chain(
  first: Meaning,
  links: readonly { readonly sign: Token; readonly meaning: Meaning }[],
): Meaning {
  const column = links[0]?.sign.column ?? first.column
  const way = links[0]?.sign.code.charAt(0)
  const astray = links.find(({ sign }) => !/[<>]/.test(sign.code) || !sign.code.startsWith(way ?? ''))
  if (astray && links.length > 1)
    throw faultAt(
      astray.sign.column,
      `found ${quote(astray.sign.typed)} in a row of comparisons`,
      'they must go one way, as in 1% < weight <= 5%; “and” is needed between others',
    )
  const [second] = links
  if (second && (first.kind === 'label' || second.meaning.kind === 'label'))
    return labelComparison(first, second.sign, second.meaning)
  const start = numberOf(first)
  const steps = links.map(({ sign, meaning }) => ({ holds: COMPARISONS[sign.code]!, of: numberOf(meaning) }))
  const of: Condition = (scope) => {
    let left = start(scope)
    for (const { holds, of } of steps) {
      const right = of(scope)
      if (!holds(left, right)) return false
      left = right
    }
    return true
  }
  return { kind: 'condition', column, of }
}

/** Labels are one group where they differ in case and spacing alone, and blank ones are the unassigned: as groups are everywhere. */
const plainLabel = (label: string): string => plainName(label) || plainName(UNASSIGNED)

function labelComparison(left: Meaning, { code, column, typed }: Token, right: Meaning): Meaning {
  const isPair =
    left.kind === 'label' && right.kind === 'label' && (left.typed === null) !== (right.typed === null)
  if (!isPair)
    throw faultAt(
      column,
      `group or text beside ${quote(typed)} with something else`,
      'group on one side and text in double quotes on the other are needed, as in group == "Energy"',
    )
  if (code !== '==' && code !== '!=')
    throw faultAt(
      column,
      `found ${quote(typed)} between group and text`,
      '== or != is needed: labels have no order',
    )
  const [a, b] = [left.of, right.of]
  const equal: Condition = (scope) => plainLabel(a(scope)) === plainLabel(b(scope))
  return { kind: 'condition', column, of: code === '==' ? equal : (scope) => !equal(scope) }
}

const MOST_DIGITS = 15

function call({ code, typed, column }: Token, args: readonly Quantity[]): Meaning {
  const name = code as FunctionName
  const [first, second] = args
  const counts = {
    min: 'two or more',
    max: 'two or more',
    abs: 'one',
    round: 'two (a number and its digits)',
  }
  const fits = name === 'abs' ? args.length === 1 : name === 'round' ? args.length === 2 : args.length >= 2
  if (!fits || !first)
    throw faultAt(
      column,
      `${quote(typed)} has ${args.length === 1 ? '1 argument' : `${args.length} arguments`}`,
      `${counts[name]} ${name === 'abs' ? 'is' : 'are'} needed`,
    )
  const number = (of: Quantity): Meaning => ({ kind: 'number', column, of })
  switch (name) {
    case 'abs':
      return number((scope) => Math.abs(first(scope)))
    case 'min':
      return number((scope) => args.reduce((least, of) => Math.min(least, of(scope)), Infinity))
    case 'max':
      return number((scope) => args.reduce((most, of) => Math.max(most, of(scope)), -Infinity))
    case 'round':
      return number((scope) => {
        const digits = second?.(scope) ?? 0
        if (!Number.isInteger(digits) || digits < 0 || digits > MOST_DIGITS)
          throw faultAt(
            column,
            `“round” to ${digits} digits`,
            `a whole number of digits from 0 to ${MOST_DIGITS} is needed`,
          )
        return rounded(first(scope), digits)
      })
  }
}

/** Rounds the number a cell would show (15 digits), halves away from zero: 1.005 to two digits is 1.01, as in the workbook's own ROUND. */
function rounded(value: number, digits: number): number {
  const shifted = (size: number, by: number): number => {
    const [mantissa, exponent] = size.toExponential().split('e')
    return Number(`${mantissa}e${Number(exponent) + by}`)
  }
  const size = shifted(Math.round(shifted(Number(Math.abs(value).toPrecision(15)), digits)), -digits)
  return Number.isFinite(size) ? Math.sign(value) * size : value
}
