import type { Culture } from '../../../src/sheet'
import { attempt, explain } from '../../../src/sheet'
import type { Expressions, RuleScope } from '../../../src/sheet/expression'
import { loadExpressions, plainNumber, RULE_FUNCTIONS, RULE_NAMES } from '../../../src/sheet/expression'
import { faultOf } from '../../fault-of'
import { ENGLISH, GERMAN } from './blocks-of-cells'

let expressions: Expressions
beforeAll(async () => {
  expressions = await loadExpressions()
})

/** Invented figures that keep apart what a rule could confuse. */
const HOLDING: RuleScope = {
  holding: 'Alder',
  weight: 0.1,
  amount: 250,
  risk_share: 0.2,
  contribution: 0.03,
  marginal: 0.3,
  volatility: 0.4,
  beta: 1.25,
  limit: 0.15,
  benchmark: 0.08,
  group: 'Energy',
}

const valueOf = (text: string, scope: Partial<RuleScope> = {}, culture: Culture = ENGLISH): number =>
  expressions.read(text, culture).evaluate({ ...HOLDING, ...scope })

/** The sentence a text ends in, where it is read or where it is worked out, and the place it points at. */
function refusal(text: string, culture: Culture = ENGLISH, scope: Partial<RuleScope> = {}) {
  const fault = faultOf(() => valueOf(text, scope, culture))
  expect(fault.code).toBe('expression')
  return { column: fault.where.column, sentence: explain(fault, () => '') }
}

// Values below are worked out by hand; products and sums of decimal fractions are right to a few units of the last digit: 1e-15.

describe('a rule', () => {
  it.each([
    ['weight * 0.9', 0.09],
    ['weight - 2%', 0.08],
    ['min(weight, 5%)', 0.05],
    ['max(weight, 5%, limit)', 0.15],
    ['risk_share > 15% ? weight * 15% / risk_share : weight', 0.075],
    ['group == "Energy" ? weight / 2 : weight', 0.05],
    ['group != "Energy" ? weight / 2 : weight', 0.1],
    ['"Energy" == group ? 1% : 2%', 0.01],
    ['amount / 1000 + contribution + marginal + volatility + beta + benchmark', 2.31],
    ['5%', 0.05],
    ['0.05', 0.05],
    ['.05', 0.05],
    ['-2.5 %', -0.025],
    ['1e-2', 0.01],
    ['1E+2%', 1],
    ['weight - -2%', 0.12],
    ['abs(weight - 30%)', 0.2],
    ['-(weight + 1%) * 2', -0.22],
    ['8% / 4 / 2', 0.01],
    ['8% - 4% - 2%', 0.02],
    ['2% + 3% * 2', 0.08],
    ['1% < weight <= 10% ? 1 : 2', 1],
    ['1% < weight < 10% ? 1 : 2', 2],
    ['weight > 5% and beta > 2 or group == "energy" ? 1 : 2', 1],
    ['weight > 5% and (beta > 2 or group == "Utilities") ? 1 : 2', 2],
    ['not (weight > 5%) ? 1 : 2', 2],
    ['weight < 5% ? 1 : weight < 20% ? 2 : 3', 2],
    ['weight > 5% ? (weight > 20% ? 1 : 2) : 3', 2],
    ['min(weight > 5% ? 4 : 5, 6)', 4],
    ['round(weight / 3, 3)', 0.033],
    ['WEIGHT * Risk_Share + MIN(1, 2)', 1.02],
    ['\tweight\u00a0-\u202f2\u2009%  ', 0.08],
  ])('%s', (text, value) => {
    expect(Math.abs(valueOf(text) - value)).toBeLessThanOrEqual(1e-15)
  })

  it('takes x% for x/100 wherever it stands, never for a part of what is before it', () => {
    expect(valueOf('weight - 2%', { weight: 0.5 })).toBe(0.48)
    expect(valueOf('weight + 10%', { weight: 0 })).toBe(0.1)
    expect(valueOf('200% * 50%')).toBe(1)
  })

  it('lists the names it uses, once each and spelt as they are', () => {
    expect(expressions.read('Beta > 1 ? weight * 2 / BETA : limit', ENGLISH).names).toEqual([
      'beta',
      'weight',
      'limit',
    ])
    expect(expressions.read('5%', ENGLISH).names).toEqual([])
  })

  it('knows each name it promises, and no figure under another name', () => {
    for (const name of Object.keys(RULE_NAMES) as (keyof typeof RULE_NAMES)[])
      if (name !== 'group') expect(valueOf(name)).toBe(HOLDING[name])
    expect(Object.keys(RULE_FUNCTIONS)).toEqual(['min', 'max', 'abs', 'round'])
  })

  it('lists the labels it compares with, as typed and where', () => {
    const rule = expressions.read('group == "Oil ""heavy""" or "x" != group ? 1 : 2', ENGLISH)
    expect(rule.labels).toEqual([
      { label: 'Oil "heavy"', column: 9 },
      { label: 'x', column: 28 },
    ])
    expect(rule.evaluate({ ...HOLDING, group: 'oil  "Heavy"' })).toBe(1)
  })

  it.each([
    ['energy', 1],
    [' ENERGY ', 1],
    ['Energy 2', 2],
    ['', 2],
  ])('compares labels as groups are told apart, by neither case nor spacing: “%s”', (group, value) => {
    expect(valueOf('group == "Energy" ? 1 : 2', { group })).toBe(value)
  })

  it('has blank labels in the group they are shown in', () => {
    expect(valueOf('group == "Unassigned" ? 1 : 2', { group: ' ' })).toBe(1)
    expect(valueOf('group == "" ? 1 : 2', { group: '' })).toBe(1)
    expect(valueOf('group == "" ? 1 : 2')).toBe(2)
  })

  it('takes text in any language for a label, whatever signs stand in it', () => {
    for (const label of ['Énergie', '能源', '\\u0022', "a'b", '(', '-', '😀 x', '# no comment', '</script>'])
      expect(valueOf(`group == "${label}" ? 1 : 2`, { group: label })).toBe(1)
  })

  it.each([
    ['0.1 + 0.2 == 0.3', true],
    ['0.1 + 0.2 > 0.3', false],
    ['0.1 + 0.2 <= 0.3', true],
    ['0.3 >= 0.1 + 0.2', true],
    ['0.1 + 0.2 != 0.3', false],
    ['0.3 < 0.3000000001', true],
    ['0.3 == 0.3000000001', false],
  ])('compares to 12 digits, since the last ones are chance: %s is %s', (condition, holds) => {
    expect(valueOf(`${condition} ? 1 : 2`)).toBe(holds ? 1 : 2)
  })

  // Rounding of halves away from zero, on the 15 digits a cell shows: what the ROUND of spreadsheets does (common practice, no source).
  it.each([
    ['round(1.005, 2)', 1.01],
    ['round(-2.5, 0)', -3],
    ['round(2.5, 0)', 3],
    ['round(0.1 + 0.2 - 0.25, 2)', 0.05],
    ['round(1.45 - 0.2, 1)', 1.3],
    ['round(1e-9, 3)', 0],
    ['round(1e300, 2)', 1e300],
    ['round(123.456, 15)', 123.456],
  ])('%s', (text, value) => {
    expect(valueOf(text)).toBe(value)
  })

  it('gives no minus zero, which would be shown as one', () => {
    expect(valueOf('-weight', { weight: 0 })).toBe(0)
    expect(valueOf('round(-0.001, 2)')).toBe(0)
  })

  it('looks at nothing of a holding but what it names, and only where its case needs it', () => {
    const looked: (string | symbol)[] = []
    const scope = new Proxy(HOLDING, {
      get(target, name) {
        looked.push(name)
        return Reflect.get(target, name) as unknown
      },
    })
    expect(expressions.read('weight > 5% ? beta * 2 : limit + amount', ENGLISH).evaluate(scope)).toBe(2.5)
    expect(looked).toEqual(['weight', 'beta'])
    expect(
      expressions.read('weight > 5% or limit > 0 ? 1 : 2', ENGLISH).evaluate({ ...HOLDING, limit: null }),
    ).toBe(1)
    expect(
      expressions.read('weight < 5% and limit > 0 ? 1 : 2', ENGLISH).evaluate({ ...HOLDING, limit: null }),
    ).toBe(2)
  })
})

describe('with a decimal comma', () => {
  it.each([
    ['2,5%', 0.025],
    ['weight - 2,5%', 0.075],
    ['min(weight; 2,5%)', 0.025],
    ['min(weight;2)', 0.1],
    ['max(,5;,25)', 0.5],
    ['abs(2,5)', 2.5],
    ['1,5e1', 15],
  ])('%s is read', (text, value) => {
    expect(Math.abs(valueOf(text, {}, GERMAN) - value)).toBeLessThanOrEqual(1e-15)
  })

  it.each([
    [
      '2.5%',
      0,
      'Found “2.5”, which can be read in more than one way; a comma is needed before decimals, and no mark between thousands.',
    ],
    ['weight - .5', 9, 'Found “.5”, which can be read in more than one way; a comma'],
    ['1.234,5', 0, 'Found “1.234,5”, which can'],
    [
      'min(weight, 5%)',
      10,
      'Found “,”; a ; is needed between arguments, and digits on both sides of a decimal comma.',
    ],
    ['min(weight,5)', 10, 'Found “,”; a ; is needed'],
    ['min(2,5)', 0, '“min” has 1 argument; two or more are needed.'],
    ['1,2,3', 0, '“1,2,3” is no number; digits with one decimal mark at most are needed.'],
    ['min', 0, '“min” without arguments; parentheses are needed behind it, as in min(weight; 5%).'],
  ])('%s is refused', (text, column, sentence) => {
    const told = refusal(text, GERMAN)
    expect(told.column).toBe(column)
    expect(told.sentence).toContain(sentence)
  })
})

/** What is refused with the place it is refused at and (part of) the sentence: the whole of it where it ends with a full stop. */
const REFUSED: Readonly<
  Record<string, readonly (readonly [text: string, column: number, sentence: string])[]>
> = {
  'a percent sign that is none': [
    [
      '5 % 3',
      4,
      '“5 %” and “3” stand side by side; an operator is needed between them: % means hundredths, never a remainder.',
    ],
    [
      'weight % 3',
      7,
      'Found “%”; a number is needed right before it, as in 2%: it means hundredths, never a remainder.',
    ],
    ['5% weight', 3, 'never a remainder.'],
    ['5%%', 2, 'Found “%”; a number is needed right before it'],
    ['weight%', 6, 'Found “%”; a number is needed right before it'],
    ['(1 + 2)%', 7, 'Found “%”; a number is needed right before it'],
    ['% 5', 0, 'Found “%”; a number is needed right before it'],
    ['weight mod 3', 7, '“mod” is no name in a rule'],
  ],
  'values side by side': [
    ['2 weight', 2, '“2” and “weight” stand side by side; an operator such as * is needed between them.'],
    ['weight weight', 7, 'stand side by side'],
    ['weight 2', 7, 'stand side by side'],
    ['2(3)', 1, '“2” and “(” stand side by side'],
    ['(2)(3)', 3, '“)” and “(” stand side by side'],
    ['1 000', 2, '“1” and “000” stand side by side'],
    ['1/2 weight', 4, 'stand side by side'],
    ['2 min(1, 2)', 2, 'stand side by side'],
    ['weight(2)', 0, '“weight” is no function of a rule; the functions are min, max, abs and round.'],
  ],
  'names out of reach': [
    [
      'price',
      0,
      '“price” is no name in a rule; the names are weight, amount, risk_share, contribution, marginal, volatility, beta, limit, benchmark and group.',
    ],
    ['risk share', 0, '“risk” is no name'],
    ['constructor', 0, '“constructor” is no name'],
    ['weight + __proto__', 9, '“__proto__” is no name'],
    ['toString()', 0, '“toString” is no function'],
    ['hasOwnProperty("a")', 0, '“hasOwnProperty” is no function'],
    ['this', 0, '“this” is no name'],
    ['globalThis', 0, '“globalThis” is no name'],
    ['holding', 0, '“holding” is no name'],
    [
      'weight.constructor',
      6,
      'Found “.”; numbers, names, text in double quotes, + - * / ( ) ? : and comparisons are what a rule is made of.',
    ],
    ['weight.constructor.constructor("return 1")()', 6, 'Found “.”'],
    ['weight["constructor"]', 6, 'Found “[”'],
    ['weight?.constructor', 7, 'Found “.”'],
    ['import("node:fs")', 0, '“import” is no function'],
    ['eval("1")', 0, '“eval” is no function'],
    ['evaluate("1")', 0, '“evaluate” is no function'],
    ['parse("1")', 0, '“parse” is no function'],
    ['createUnit("x")', 0, '“createUnit” is no function'],
    ['config({})', 0, '“config” is no function'],
    ['sqrt(4)', 0, '“sqrt” is no function'],
    ['sum(1:10000000)', 0, '“sum” is no function'],
    ['factorial(170)', 0, '“factorial” is no function'],
    ['pi', 0, '“pi” is no name'],
    ['e', 0, '“e” is no name'],
    ['i', 0, '“i” is no name'],
    ['true', 0, '“true” is no name'],
    ['null', 0, '“null” is no name'],
    ['undefined', 0, '“undefined” is no name'],
    ['NaN', 0, '“NaN” is no name'],
    ['Infinity', 0, '“Infinity” is no name'],
    ['end', 0, '“end” is no name'],
    ['5 cm', 2, '“cm” is no name'],
    ['2 inch to cm', 2, '“inch” is no name'],
    ['0x10', 1, '“x10” is no name'],
    ['0b11', 1, '“b11” is no name'],
    ['2e', 1, '“e” is no name'],
    ['if(weight > 5%, 1, 2)', 0, 'Found “if”; condition ? one number : other number is needed.'],
  ],
  'signs that a rule has not': [
    ['weight = 5%', 7, 'Found “=”; == is needed to compare.'],
    ['weight => 5%', 7, 'Found “=”; == is needed'],
    ['=weight * 0.9', 0, 'Found “=” at the beginning; a rule begins without it.'],
    ['f(x) = x', 0, '“f” is no function'],
    ['min(weight, 1) = 2', 15, 'Found “=”'],
    ['weight <> 5% ? 1 : 2', 7, 'Found “<>”; != is needed for “not equal”.'],
    ['weight > 1 && beta > 1', 11, 'Found “&&”; “and” is needed.'],
    ['weight > 1 || beta > 1', 11, 'Found “||”; “or” is needed.'],
    ['!(weight > 1) ? 1 : 2', 0, 'Found “!”; “not”, or != between two values, is needed.'],
    ['weight!', 6, 'Found “!”'],
    ['2^9^9^9', 1, 'Found “^”; a product is needed: powers are no part of a rule.'],
    ['2 ** 3', 3, 'Found “*”; a number, a name or “(” is needed.'],
    ['1 .* 2', 2, 'Found “.”'],
    ['1 >> 2', 2, 'Found “>”'],
    ['~1', 0, 'Found “~”'],
    ['[1, 2]', 0, 'Found “[”'],
    ['{a: 1}', 0, 'Found “{”'],
    ['1; 2', 1, 'Found “;”; a comma is needed between arguments.'],
    ['1 # a comment', 2, 'Found “#”'],
    ['1 // a comment', 5, '“a” is no name'],
    ['$weight', 0, 'Found “$”'],
    ['€ 5', 0, 'Found “€” (U+20AC)'],
    ['weight\\n', 6, 'Found “\\”'],
  ],
  'look-alikes and what cannot be seen': [
    ['w\u0435ight', 1, '“е” (U+0435) in “wеight”; names are of plain letters (a to z) and underscores.'],
    ['\uff57eight', 0, '“ｗ” (U+FF57)'],
    ['weight\u0301', 6, 'An unseen character (U+0301)'],
    ['\ud835\udc64eight', 0, '(U+1D464)'],
    ['weight \u2212 2%', 7, 'Found “−” (U+2212); the minus sign of the keyboard (-) is needed.'],
    ['weight \u2013 2%', 7, 'the minus sign of the keyboard (-) is needed.'],
    ['weight \u00d7 2', 7, 'Found “×” (U+00D7); * is needed.'],
    ['weight \u00f7 2', 7, '/ is needed.'],
    ['weight \u2265 2 ? 1 : 2', 7, '>= is needed.'],
    ['weight \u2264 2 ? 1 : 2', 7, '<= is needed.'],
    ['weight \u2260 2 ? 1 : 2', 7, '!= is needed.'],
    [
      'group == \u201cEnergy\u201d ? 1 : 2',
      9,
      'Found a curved quotation mark (U+201C); double quotes (") are needed around text, at both ends.',
    ],
    ["group == 'Energy' ? 1 : 2", 9, "Found “'”; double quotes"],
    ['group == "Energy ? 1 : 2', 9, 'Found “"”; a second " is needed where the text ends.'],
    ['weight\u200b', 6, 'Found an unseen character (U+200B)'],
    ['\u202eweight', 0, 'Found an unseen character (U+202E)'],
    ['weight\u0000', 6, 'Found an unseen character (U+0000)'],
    ['\ud800', 0, 'Found an unseen character (U+D800)'],
    ['\u0665', 0, 'Found “٥” (U+0665)'],
    ['weight \ud83d\ude00', 7, 'Found “😀” (U+1F600)'],
    ['weight\n- 2%', 6, 'Found a line break; a rule stands on one line.'],
    ['weight\r', 6, 'Found a line break'],
    ['weight\u2028', 6, 'Found a line break'],
    ['group == "a\nb" ? 1 : 2', 9, 'Found “"”'],
  ],
  'numbers that can be read in two ways': [
    [
      '2,5%',
      0,
      'Found “2,5”, which can be read in more than one way; a point is needed before decimals, no mark between thousands, and a space after a comma between arguments.',
    ],
    ['min(2,5)', 4, 'Found “2,5”, which can'],
    ['min(weight, 2,5%)', 12, 'Found “2,5”, which can'],
    ['1,000', 0, 'Found “1,000”, which can'],
    ['1.2.3', 0, '“1.2.3” is no number; digits with one decimal mark at most are needed.'],
    ['(3%)', 0, 'Found a number in parentheses, which can mean one below zero; 3% or -3% is needed.'],
    ['+2%', 0, 'Found “+” with nothing before it; a number is needed on both sides, as in weight + 2%.'],
    ['1e999', 0, '“1e999” is too large; a smaller number is needed.'],
  ],
  'what is not whole': [
    ['', 0, 'Nothing is typed; a number or a rule is needed, such as weight - 2%.'],
    ['  ', 0, 'Nothing is typed'],
    ['weight -', 8, 'The rule ends here; a number, a name or “(” is needed.'],
    ['weight -   ', 8, 'The rule ends here'],
    ['* 2', 0, 'Found “*”; a number, a name or “(” is needed.'],
    ['weight + * 2', 9, 'Found “*”'],
    ['weight + + 2', 9, 'Found “+” with nothing before it'],
    ['(weight', 0, 'Found “(” that is not closed; a “)” is needed behind it.'],
    ['2 * ((weight)', 4, 'Found “(” that is not closed'],
    ['weight)', 6, 'Found “)” without a “(” before it; they are needed in pairs.'],
    ['()', 1, 'Found “)”; a number'],
    ['(1, 2)', 2, 'Found “,” outside a function; it parts the arguments of min, max, abs and round only.'],
    ['1, 2', 1, 'Found “,” outside a function'],
    ['min', 0, '“min” without arguments; parentheses are needed behind it, as in min(weight, 5%).'],
    ['min + 1', 0, '“min” without arguments'],
    ['min()', 0, '“min” has 0 arguments; two or more are needed.'],
    ['MAX(1)', 0, '“MAX” has 1 argument; two or more are needed.'],
    ['abs(1, 2)', 0, '“abs” has 2 arguments; one is needed.'],
    ['round(weight)', 0, '“round” has 1 argument; two (a number and its digits) are needed.'],
    ['min(1, )', 7, 'Found “)”; a number'],
    ['min(, 1)', 4, 'Found “,”; a number'],
    [
      'weight > 5% ? 1',
      15,
      'The rule ends here; a “:” and the number for the other case are needed, an inner ? : in parentheses.',
    ],
    ['weight > 5% ? 1 :', 17, 'The rule ends here; a number, a name or “(” is needed.'],
    ['weight > 5% ? : 2', 14, 'Found “:”; a number'],
    ['(weight > 5% ? 1) + 2', 16, 'Found “)”; a “:” and the number for the other case'],
    ['weight > 5% ? weight > 9% ? 1 : 2 : 3', 37, 'an inner ? : in parentheses.'],
    [
      'weight > 5% ? 1 : 2 : 3',
      20,
      'Found a “:” that belongs to no “?”; condition ? one number : other number is needed, an inner one in parentheses.',
    ],
    ['1 : 2', 2, 'Found a “:” that belongs to no “?”'],
    [': 2', 0, 'Found a “:” that belongs to no “?”'],
  ],
  'parts in places where they mean nothing': [
    [
      'weight > 5%',
      7,
      'A condition stands where a number belongs; condition ? one number : other number is needed.',
    ],
    ['(weight > 5%) * 2', 8, 'A condition stands where a number belongs'],
    ['-(weight > 5%)', 9, 'A condition stands where a number belongs'],
    ['min(weight > 5%, 2)', 11, 'A condition stands where a number belongs'],
    ['weight > 5% ? beta > 1 : 2', 19, 'A condition stands where a number belongs'],
    [
      'weight ? 1 : 2',
      0,
      'Found a value where a condition belongs; a comparison such as weight > 5% is needed.',
    ],
    ['weight and beta > 1 ? 1 : 2', 0, 'Found a value where a condition belongs'],
    [
      'not weight > 5% ? 1 : 2',
      0,
      'Found “not” before a value; a condition in parentheses is needed behind it, as in not (weight > 5%).',
    ],
    ['weight > and', 9, '“and” has no meaning here; a number, a name or “(” is needed.'],
    ['and (weight > 5%)', 0, '“and” has no meaning here'],
    [
      '1% < weight > 2% ? 1 : 2',
      12,
      'Found “>” in a row of comparisons; they must go one way, as in 1% < weight <= 5%; “and” is needed between others.',
    ],
    ['1 == weight == 1 ? 1 : 2', 2, 'Found “==” in a row of comparisons'],
    ['1 < weight != 1 ? 1 : 2', 11, 'Found “!=” in a row of comparisons'],
    [
      '"Energy"',
      0,
      'The text "Energy" stands where a number belongs; group and text are needed on the two sides of == or !=, and nowhere else.',
    ],
    ['group', 0, 'Group stands where a number belongs'],
    ['group * 2', 0, 'Group stands where a number belongs'],
    ['"a" + "b"', 0, 'The text "a" stands where a number belongs'],
    ['group ? 1 : 2', 0, 'Found a value where a condition belongs'],
    [
      'group == weight ? 1 : 2',
      6,
      'Group or text beside “==” with something else; group on one side and text in double quotes on the other are needed, as in group == "Energy".',
    ],
    ['weight == "5%" ? 1 : 2', 7, 'Group or text beside “==” with something else'],
    ['"a" == "a" ? 1 : 2', 4, 'Group or text beside “==” with something else'],
    ['group == group ? 1 : 2', 6, 'Group or text beside “==” with something else'],
    ['group > "a" ? 1 : 2', 6, 'Found “>” between group and text; == or != is needed: labels have no order.'],
    ['group == "a" == "b" ? 1 : 2', 6, 'in a row of comparisons'],
  ],
  'what has no result': [
    [
      'weight / 0',
      7,
      'The divisor is 0 for “Alder”; another one, or a condition that keeps it from being 0, is needed.',
    ],
    ['1 + weight / (beta - beta)', 11, 'The divisor is 0 for “Alder”'],
    ['0 / 0%', 2, 'The divisor is 0'],
    [
      '1e308 * weight * 1e3',
      15,
      'The result for “Alder” is larger than any number; smaller numbers are needed.',
    ],
    ['-1e308 - 1e308', 7, 'larger than any number'],
    ['weight / 1e-320 / 1e-320', 7, 'larger than any number'],
    ['round(weight, 0.5)', 0, '“round” to 0.5 digits; a whole number of digits from 0 to 15 is needed.'],
    ['round(weight, -1)', 0, '“round” to -1 digits'],
    ['round(weight, 16)', 0, '“round” to 16 digits'],
  ],
}

describe.each(Object.entries(REFUSED))('%s', (_, cases) => {
  it.each(cases)('%j is refused at its place (%i)', (text, column, sentence) => {
    const told = refusal(text)
    expect(told.column).toBe(column)
    if (sentence.endsWith('.')) expect(told.sentence.endsWith(sentence)).toBe(true)
    else expect(told.sentence).toContain(sentence)
  })
})

describe('a holding without a figure', () => {
  it.each([
    ['limit', { limit: null }, 0, 'Limit of “Alder” has no value; the rule needs a number there.'],
    ['weight < limit ? 1 : 2', { limit: null }, 9, 'Limit of “Alder” has no value'],
    ['1 / risk_share', { risk_share: null }, 4, 'Risk_share of “Alder” has no value'],
    ['beta', { beta: NaN }, 0, 'Beta of “Alder” has no value'],
    ['weight', { weight: Infinity }, 0, 'Weight of “Alder” has no value'],
    [
      'group == "a" ? 1 : 2',
      { group: null },
      0,
      'Group of “Alder” has no value; the rule needs a label there.',
    ],
  ] as const)('%s names the figure and its place', (text, scope, column, sentence) => {
    const told = refusal(text, ENGLISH, scope)
    expect(told.column).toBe(column)
    expect(told.sentence).toContain(sentence)
  })

  it('is told without a name where none is known', () => {
    const { holding: _, ...scope } = { ...HOLDING, limit: null }
    const { fault } = attempt(() => expressions.read('2 * limit', ENGLISH).evaluate(scope))
    expect(explain(fault!)).toBe(
      'Character 5: limit of this holding has no value; the rule needs a number there.',
    )
  })
})

describe('what is too much', () => {
  const much: Readonly<Record<string, string>> = {
    'opening parentheses': '('.repeat(500),
    'nested functions': 'abs('.repeat(125),
    'minus signs': `${'-'.repeat(499)}1`,
    negations: `${'not '.repeat(121)}(1 > 2) ? 1 : 2`,
    'cases in a row': `${'1>2?1:'.repeat(83)}1`,
    'cases in cases': `${'1>2?'.repeat(124)}1`,
    sums: `${'1+'.repeat(249)}1`,
    comparisons: `${'1<'.repeat(246)}2?1:2`,
    'cases and parentheses': `${'-('.repeat(32)}${'1>2?1:'.repeat(60)}1${')'.repeat(32)}`,
    quotes: '"'.repeat(500),
    'digits and marks': '1.'.repeat(250),
    'a long name': 'a'.repeat(500),
    spaces: ' '.repeat(500),
  }

  it.each(Object.keys(much))('%s end in a number or a fault, soon', (kind) => {
    const began = performance.now()
    const { value, fault } = attempt(() => valueOf(much[kind]!))
    // a few milliseconds each where the machine is free: the bound only tells an end from none
    expect(performance.now() - began).toBeLessThan(1000)
    expect(fault?.code ?? Number.isFinite(value)).toBe(fault ? 'expression' : true)
  })

  it('a text of more than 500 characters is not looked at', () => {
    expect(refusal('x'.repeat(501))).toEqual({
      column: 500,
      sentence: 'A rule of 501 characters; one of 500 at most is needed.',
    })
    expect(refusal(`1${'+1'.repeat(1e6)}`).column).toBe(500)
    expect(valueOf(`${' '.repeat(499)}1`)).toBe(1)
  })

  it('parentheses go 32 deep, and no deeper', () => {
    expect(valueOf(`${'('.repeat(32)}1 + 1${')'.repeat(32)}`)).toBe(2)
    expect(refusal(`${'('.repeat(33)}1 + 1${')'.repeat(33)}`)).toEqual({
      column: 32,
      sentence: 'Parentheses more than 32 deep; a simpler rule is needed.',
    })
  })

  it('holds where little is left of the stack', () => {
    // as many calls as a pane can have open while it draws, and more
    const under = (calls: number): number =>
      calls === 0 ? valueOf(much['cases in a row']!) : under(calls - 1)
    expect(under(2000)).toBe(1)
  })
})

it('a fault of a rule says which character it speaks of, unless the place is shown otherwise', () => {
  const fault = faultOf(() => valueOf('weight % 3'))
  expect(explain(fault)).toBe(
    'Character 8: found “%”; a number is needed right before it, as in 2%: it means hundredths, never a remainder.',
  )
  expect(explain(fault, () => '')).toMatch(/^Found “%”/)
})

describe('a plain number', () => {
  it.each([
    ['5%', ENGLISH, { value: 0.05, percent: true }],
    [' -2.5 % ', ENGLISH, { value: -0.025, percent: true }],
    ['- 5', ENGLISH, { value: -5, percent: false }],
    ['.5', ENGLISH, { value: 0.5, percent: false }],
    ['1e-2', ENGLISH, { value: 0.01, percent: false }],
    ['-0%', ENGLISH, { value: 0, percent: true }],
    ['2,5%', GERMAN, { value: 0.025, percent: true }],
    [',5', GERMAN, { value: 0.5, percent: false }],
  ] as const)('%s is one, with or without its percent sign', (text, culture, value) => {
    expect(plainNumber(text, culture)).toEqual(value)
    expect(valueOf(text, {}, culture)).toBe(value.value)
  })

  it.each([
    ['weight', ENGLISH],
    ['5 + 1', ENGLISH],
    ['(5%)', ENGLISH],
    ['+5%', ENGLISH],
    ['--5', ENGLISH],
    ['5%%', ENGLISH],
    ['1,000', ENGLISH],
    ['2,5', ENGLISH],
    ['2.5', GERMAN],
    ['1e999', ENGLISH],
    ['5.', ENGLISH],
    ['', ENGLISH],
    ['%', ENGLISH],
    ['5%\n', ENGLISH],
    ['\u0665', ENGLISH],
  ] as const)('%j is none', (text, culture) => {
    expect(plainNumber(text, culture)).toBeNull()
  })
})
