const fs = require('node:fs')
const ts = require('typescript')

/**
 * The page that each function's help address points into, made from the comments above the functions: what the host is told of them
 * (description, arguments) and the tags it knows nothing of (@returns, @formula, @remarks, @throws, @source, @example). One file without
 * scripts, fonts or pictures of its own.
 */

const escape = (text) =>
  text.replace(/[&<>"]/g, (sign) => ({ '&': '&amp;', '<': '&lt;', '>': '&gt;', '"': '&quot;' })[sign])

// ---- what the comments say

/** Tags by name, each as the texts it was given; line breaks are the comment's own affair. */
function tagsOf(declaration) {
  const tags = {}
  for (const { tagName, comment } of ts.getJSDocTags(declaration)) {
    const text = (ts.getTextOfJSDocComment(comment) ?? '').replace(/\s+/g, ' ').trim()
    ;(tags[tagName.text] ??= []).push(text)
  }
  return tags
}

/** The tags of every worksheet function in a file, by id. */
function commentsOf(file) {
  const source = ts.createSourceFile(file, fs.readFileSync(file, 'utf8'), ts.ScriptTarget.Latest, true)
  const found = source.statements
    .filter(ts.isFunctionDeclaration)
    .map(tagsOf)
    .filter(({ customfunction }) => customfunction)
  return Object.fromEntries(found.map((tags) => [tags.customfunction[0], tags]))
}

/** Every kind of fault that a function's comment names, in words. Codes are those of the program's one list. */
const FAULTS = {
  blank: ['a blank cell', 'A number, a name or a date is missing within a block.'],
  text: ['text in place of a number', 'The cell holds text, also where it looks like a number.'],
  'not-a-number': ['something that is no number', 'A truth value, a date or an infinite number stands where a number belongs.'],
  shape: ['sizes that do not fit', 'One weight, name or group for each column of the risk is needed, in one row or one column.'],
  'out-of-range': ['a number out of range', 'The number cannot be: a price of 0, a confidence of 30%, a result too large for a cell.'],
  twice: ['a name or date that is there twice', 'Names of columns and dates of rows have to differ.'],
  'too-few': ['too few dates', 'Two dates of returns, or three prices, are the least there can be.'],
  'unknown-choice': ['a choice that is not known', 'An estimator, kind or method is misspelt, or does not go with the other arguments.'],
  'missing-data': ['missing data that came as zeros', 'Blank cells reach a function as zeros: a run of more than ten exact zeros at an end of a column that moves otherwise is taken for missing data.'],
  'not-symmetric': ['a matrix that is not symmetric', 'Of a covariance matrix both halves have to agree.'],
  'correlation-matrix': ['a correlation matrix', 'Covariances are needed: correlations times both volatilities.'],
  'negative-variance': ['a negative variance', 'The matrix gives some portfolio a variance below 0, which no data can have.'],
  'zero-risk': ['no risk to divide by', 'Shares, betas and marginal contributions do not exist where nothing moves.'],
  unmatched: ['a name without a column', 'The first row of the risk has no such name.'],
} // prettier-ignore

/** What a cell shows for a kind of fault: figures that do not exist differ from arguments that are wrong. */
const errorOf = (code) => (['zero-risk', 'missing-data'].includes(code) ? '#N/A' : '#VALUE!')

/**
 * The faults a function can meet, each once, in the order of its comment; "as OTHER" brings those of another one.
 *
 * @throws Error  where the comment names what is not known
 */
function faultsOf(id, comments) {
  const notes = new Map()
  const add = (code, note) => notes.set(code, [...(notes.get(code) ?? []), ...note])
  for (const part of (comments[id]?.throws?.[0] ?? '').replace(/^Fault /, '').split('|')) {
    const [, other, code, note] = /^\s*(?:as ([A-Z]+)|"([a-z-]+)")\s*(?:\((.*)\))?\s*$/.exec(part) ?? []
    if (other && other !== id) for (const fault of faultsOf(other, comments)) add(fault.code, fault.notes)
    else if (FAULTS[code]) add(code, note ? [note] : [])
    else throw new Error(`${id}: @throws ${part.trim()} is not known`)
  }
  return [...notes].map(([code, found]) => ({ code, notes: found }))
}

// ---- formulas

const GREEK = { beta: 'β', lambda: 'λ', omega: 'ω', phi: 'φ', rho: 'ρ', mu: 'μ', delta: 'δ', Gamma: 'Γ' }

/**
 * A formula in plain text, set: x_i and x_{ij} low, x^2 high, single letters slanted, sqrt(...) and sum as signs. "name: formula" sets the
 * name before it.
 */
function formulaSet(text) {
  const { shown, rest } = signs(text)
  if (rest !== '') throw new Error(`cannot set the formula ${text}`)
  return shown
}

/** Sets a formula up to a bracket that was not opened in it; in small signs two letters are two indices. */
function signs(text, isSmall = false) {
  let rest = text
  let shown = ''
  const take = (pattern) => {
    const match = pattern.exec(rest)
    if (match) rest = rest.slice(match[0].length)
    return match
  }
  /** what stands in brackets from here to the one that closes them */
  const inside = (close, small = isSmall) => {
    const inner = signs(rest, small)
    if (!inner.rest.startsWith(close)) throw new Error(`a bracket stays open in ${text}`)
    rest = inner.rest.slice(1)
    return inner.shown
  }
  for (;;) {
    let match
    if (take(/^sqrt\(/)) shown += `√<span class="root">${inside(')')}</span>`
    else if (take(/^\(/)) shown += `(${inside(')')})`
    else if ((match = take(/^[_^]\{/))) shown += raised(match[0][0], inside('}', true))
    else if ((match = take(/^([_^])([A-Za-z0-9]+)/))) shown += raised(match[1], word(match[2], true))
    else if (take(/^sum(?![a-z])/)) shown += '∑'
    else if (isSmall && take(/^in\b/)) shown += '∈'
    else if ((match = take(/^[A-Za-z]+/))) shown += word(match[0], isSmall)
    else if (take(/^'/)) shown += '′'
    else if (take(/^>=/)) shown += '≥'
    else if (take(/^-/)) shown += '−'
    else if ((match = take(/^[^)}]/))) shown += escape(match[0])
    else return { shown, rest }
  }
}

const raised = (sign, inner) => (sign === '_' ? `<sub>${inner}</sub>` : `<sup>${inner}</sup>`)

function word(text, isSmall) {
  if (GREEK[text]) return GREEK[text]
  return /^[A-Za-z]$/.test(text) || (isSmall && /^[a-z]{2}$/.test(text)) ? `<i>${text}</i>` : text
}

/** The formulas of one function; those that have a name stand beside it. */
function formulaLines(lines) {
  const split = lines.map((line) => /^(?:([a-z][a-z, -]+): )?(.*)$/.exec(line))
  if (!split.every(([, name]) => name))
    return lines.map((line) => `<p class="formula">${formulaSet(line)}</p>`).join('\n')
  const rows = split.map(
    ([, name, formula]) => `<dt>${escape(name)}</dt><dd class="formula">${formulaSet(formula)}</dd>`,
  )
  return `<dl class="formulas">${rows.join('\n')}</dl>`
}

// ---- examples, as they are typed into a cell

/** A value of an example as a cell formula has it: blocks as array constants, what is left out as nothing. */
function typed(node) {
  if (ts.isArrayLiteralExpression(node)) {
    const rows = node.elements.map((row) => row.elements.map(typed).join(','))
    return `{${rows.join(';')}}`
  }
  if (ts.isStringLiteral(node)) return `"${node.text}"`
  if (ts.isPrefixUnaryExpression(node)) return `-${typed(node.operand)}`
  if (ts.isNumericLiteral(node)) return String(Number(node.text))
  if (node.kind === ts.SyntaxKind.NullKeyword) return ''
  throw new Error(`an example holds ${node.getText()}, which a cell cannot`)
}

/** An example of a docstring as a formula and the cells it gives. */
function exampleOf(text, namespace) {
  const cut = text.lastIndexOf(' // ')
  const expression = ts.createSourceFile('', `(${text.slice(0, cut)})`, ts.ScriptTarget.Latest, true)
    .statements[0].expression.expression
  const result = JSON.parse(text.slice(cut + 4))
  const isRow = ts.isElementAccessExpression(expression)
  const call = isRow ? expression.expression : expression
  const formula = `${namespace}.${call.expression.name.text}(${call.arguments.map(typed).join(', ')})`
  return {
    formula: isRow ? `=INDEX(${formula}, ${typed(expression.argumentExpression) * 1 + 1}, 0)` : `=${formula}`,
    cells: isRow ? [result] : Array.isArray(result) ? result : [[result]],
  }
}

function exampleShown({ formula, cells }) {
  const rows = cells.map(
    (row) => `<tr>${row.map((cell) => `<td>${escape(String(cell))}</td>`).join('')}</tr>`,
  )
  return `<div class="example"><code>${escape(formula)}</code><table aria-label="Result">${rows.join('')}</table></div>`
}

// ---- the page

const anchorOf = ({ helpUrl }) => new URL(helpUrl).hash.slice(1)

/** Text with functions' ids as links to their places, and choices in quotation marks as typed. */
function prose(text, functions, own) {
  const byId = new Map(functions.map((one) => [one.id, one]))
  return escape(text)
    .replace(/\b[A-Z]{4,}\b/g, (id) =>
      byId.has(id) && id !== own ? `<a href="#${anchorOf(byId.get(id))}">${id}</a>` : id,
    )
    .replace(/&quot;(.*?)&quot;/g, '<code>$1</code>')
}

function section(one, functions, comments, namespace) {
  const { id, description, parameters } = one
  const tags = comments[id]
  const need = (tag) => {
    if (!tags?.[tag]) throw new Error(`${id}: @${tag} is missing`)
    return tags[tag]
  }
  const text = (given) => prose(given, functions, id)
  const names = parameters.map(({ name, optional }) => (optional ? `[${name}]` : name)).join(', ')
  const rows = parameters.map(
    ({ name, optional, description: said }) =>
      `<dt><code>${name}</code>${optional ? ' <small>may be left out</small>' : ''}</dt><dd>${text(said)}</dd>`,
  )
  const faults = faultsOf(id, comments).map(
    ({ code, notes }) =>
      `<a href="#fault-${code}">${FAULTS[code][0]}</a>${notes.length > 0 ? ` (${text(notes.join('; '))})` : ''}`,
  )
  const anchor = anchorOf(one)
  return `<section id="${anchor}" aria-labelledby="${anchor}-name">
<h3 id="${anchor}-name"><a href="#${anchor}">${namespace}.${id}</a><span class="arguments">(${names})</span></h3>
<p class="lead">${text(description)}</p>
<h4>Arguments</h4>
<dl class="arguments-told">
${rows.join('\n')}
</dl>
<h4>Result</h4>
<p>${text(need('returns')[0]).replace(/ x /g, ' × ')}</p>
<h4>Formula</h4>
${formulaLines(need('formula'))}
${tags.remarks ? `<h4>Remarks</h4>\n<p>${text(tags.remarks[0])}</p>` : ''}
<h4>Example</h4>
${need('example')
  .map((example) => exampleShown(exampleOf(example, namespace)))
  .join('\n')}
<h4>What it refuses</h4>
<p>${faults.join(', ')}.</p>
<h4>Source</h4>
<p class="source">${text(need('source')[0])}</p>
</section>`
}

const STYLE = `
:root {
  color-scheme: light dark;
  --ground: #fff; --ink: #1b1f23; --quiet: #57606a; --line: #d5dae0; --shade: #f4f6f8; --link: #005777;
  font: 1rem/1.55 system-ui, "Segoe UI", sans-serif;
}
@media (prefers-color-scheme: dark) {
  :root { --ground: #16191c; --ink: #e4e7ea; --quiet: #a4adb6; --line: #3a4148; --shade: #20252a; --link: #9ac8e1; }
}
* { box-sizing: border-box; }
html { scroll-padding-top: 1rem; background: var(--ground); color: var(--ink); }
body { margin: 0 auto; padding: 1.5rem 1rem 4rem; max-width: 44rem; overflow-wrap: break-word; }
a { color: var(--link); text-underline-offset: 0.15em; text-decoration-thickness: 1px; }
a:focus-visible { outline: 2px solid var(--link); outline-offset: 2px; border-radius: 2px; }
h1 { font-size: 1.75rem; line-height: 1.2; margin: 0 0 1rem; }
h2 { font-size: 1.3rem; line-height: 1.3; margin: 3rem 0 0.75rem; }
h3 { font: 600 1.05rem/1.45 ui-monospace, "Cascadia Mono", Consolas, monospace; margin: 0 0 0.5rem; overflow-wrap: anywhere; }
h3 a { color: inherit; text-decoration: none; }
h3 a:hover { text-decoration: underline; }
h3 .arguments { font-weight: 400; color: var(--quiet); }
h4 { font-size: 0.8rem; line-height: 1.5; margin: 0; color: var(--quiet); font-weight: 600; }
p { margin: 0 0 0.75rem; }
dl { margin: 0; }
dd { margin: 0; }
code { font: 0.88em/1.5 ui-monospace, "Cascadia Mono", Consolas, monospace; }
small { color: var(--quiet); font-size: 0.8rem; }
section { padding-top: 1.75rem; margin-top: 1.75rem; border-top: 1px solid var(--line); }
section > h4 { margin-top: 0.9rem; }
section > :is(p, dl, div) { margin: 0 0 0.25rem; }
section:target > h3 { text-decoration: underline; text-decoration-thickness: 3px; text-underline-offset: 0.3em; }
.lead { font-size: 1.05rem; }
.source { color: var(--quiet); }
.arguments-told dt, .told dt { margin-top: 0.35rem; }
.arguments-told dd, .told dd { padding-left: 1.25rem; }
.formula { font-family: "Cambria Math", "STIX Two Text", Cambria, Georgia, serif; font-size: 1.1rem; line-height: 1.7; }
.formulas { display: grid; grid-template-columns: fit-content(40%) 1fr; column-gap: 1rem; align-items: baseline; }
.formulas dt { font-size: 0.9rem; color: var(--quiet); }
.formulas dd { min-width: 0; }
.told dd p { margin-bottom: 0.25rem; }
.symbols { display: grid; grid-template-columns: max-content 1fr; column-gap: 1.25rem; align-items: baseline; }
.symbols dt { margin: 0; }
.symbols dd { padding: 0; }
sub, sup { font-size: 0.72em; line-height: 0; }
.root { border-top: 1px solid currentColor; padding: 0.05em 0.15em 0; }
.example { display: flex; flex-wrap: wrap; gap: 0.5rem 1rem; align-items: start; }
.example > code { background: var(--shade); border: 1px solid var(--line); border-radius: 3px; padding: 0.2rem 0.5rem; overflow-wrap: anywhere; }
table { border-collapse: collapse; font-size: 0.9rem; font-variant-numeric: tabular-nums; }
td { border: 1px solid var(--line); padding: 0.15rem 0.5rem; text-align: right; }
@media (max-width: 30rem) { td { padding: 0.15rem 0.2rem; font-size: 0.7rem; } }
nav ul { list-style: none; padding: 0; margin: 0; columns: 2 11rem; column-gap: 1.5rem; }
nav li { break-inside: avoid; padding: 0.1rem 0; }
.skip { position: absolute; left: -100vw; }
.skip:focus { position: static; }
footer { margin-top: 3rem; padding-top: 1rem; border-top: 1px solid var(--line); color: var(--quiet); font-size: 0.875rem; }
@media (min-width: 64rem) {
  body { max-width: 66rem; display: grid; grid-template-columns: 15rem minmax(0, 1fr); column-gap: 3rem; }
  header, footer { grid-column: 2; }
  nav { grid-row: 1 / span 3; position: sticky; top: 0; align-self: start; max-height: 100vh; overflow-y: auto; padding: 1.5rem 0; margin-top: -1.5rem; }
  nav ul { columns: 1; }
  nav h2 { margin-top: 0; font-size: 1rem; }
}
@media print {
  :root { --ground: #fff; --ink: #000; --quiet: #333; --line: #999; --shade: #fff; --link: #000; font-size: 10pt; }
  body { display: block; max-width: none; padding: 0; }
  nav { position: static; max-height: none; }
  nav ul { columns: 3; }
  section, .example, tr { break-inside: avoid; }
  h2, h3, h4 { break-after: avoid; }
  a { text-decoration: none; }
  .skip { display: none; }
}
`

/** What estimators do, for the argument of that name; the sources stand in the comments of the code that computes them. */
const ESTIMATORS = [
  ['sample', "C_{ij} = sum_t z_{ti} z_{tj} / (T - 1)", 'All dates count alike. The default.', 'NIST/SEMATECH e-Handbook of Statistical Methods, 6.5.4.1 (from memory)'],
  ['exponential 0.97', "C_{ij} = sum_t omega_t z_{ti} z_{tj}, with omega_t in proportion to lambda^{T-t}", 'Each date counts the decay factor λ times the one after it; the weights ω add up to 1, and z is the return less the weighted mean. 0.94 where no factor is given; “0,97” is read as well.', 'J.P. Morgan/Reuters, Technical Document, 4th ed. (1996), chapter 5 (from memory)'],
  ['shrink identity', "(1 - a) S + a mu I", 'S is the covariance with divisor T, μ the mean of its variances, a the intensity that the article derives from the data. One variance for all: a poor target where volatilities lie far apart.', 'Ledoit & Wolf (2004), Journal of Multivariate Analysis 88(2), 365-411 (from memory)'],
  ['shrink correlation', "(1 - a) S + a F, where F_{ii} = S_{ii} and F_{ij} = r sqrt(S_{ii} S_{jj})", 'r is the mean of all correlations, a the intensity that the article derives from the data.', 'Ledoit & Wolf (2004), Journal of Portfolio Management 30(4), appendix (from memory)'],
  ['shrink oas', "(1 - a) S + a mu I", 'As “shrink identity”, with an intensity derived for normal returns.', 'Chen, Wiesel, Eldar & Hero (2010), IEEE Transactions on Signal Processing 58(10), equation 23 (from memory)'],
  ['lagged 2', "Gamma_0 + sum_k (1 - k / (m + 1)) (Gamma_k + Gamma_k')", 'Γ is the covariance of each date with the date k before it, divisor T, k from 1 to the number m that is given (1 to 10): for markets that close at different hours.', 'Newey & West (1987), Econometrica 55(3), 703-708 (from memory)'],
] // prettier-ignore

const SYMBOLS = [
  ['w_i', 'weight of position i, a fraction of capital'],
  ['C', 'covariance matrix of the returns, by the estimator chosen'],
  ["(C w)_i", 'covariance of position i with the portfolio'],
  ['s', 'volatility of the portfolio, its standard deviation'],
  ['r_{ti}', 'return of position i on date t, of T dates'],
  ['z_{ti}', 'the same less its mean'],
  ['p_i', 'share of risk of position i'],
] // prettier-ignore

/**
 * @param functions  as functions.json describes them, addresses as deployed
 * @param file       the source whose comments tell the rest
 * @returns          the text of the page
 * @throws Error     where a comment lacks a part or names what is not known
 */
function helpPage(functions, { file, namespace, version }) {
  const comments = commentsOf(file)
  const missed = functions.flatMap(({ id }) =>
    ['returns', 'formula', 'example', 'source', 'throws'].flatMap((tag) =>
      comments[id]?.[tag] ? [] : [`${id}: @${tag} is missing`],
    ),
  )
  if (missed.length > 0) throw new Error(missed.join('\n'))
  const links = functions.map((one) => `<li><a href="#${anchorOf(one)}">${one.id}</a></li>`)
  const estimators = ESTIMATORS.map(
    ([name, formula, said, source]) => `<dt><code>${name}</code></dt>
<dd><p class="formula">${formulaSet(formula)}</p><p>${escape(said)} <small>${escape(source)}</small></p></dd>`,
  )
  const used = new Set(functions.flatMap(({ id }) => faultsOf(id, comments).map(({ code }) => code)))
  const faults = Object.entries(FAULTS)
    .filter(([code]) => used.has(code))
    .map(
      ([code, [short, said]]) =>
        `<dt id="fault-${code}"><strong>${short.charAt(0).toUpperCase()}${short.slice(1)}</strong> <small>${errorOf(code)}</small></dt><dd>${said}</dd>`,
    )
  const symbols = SYMBOLS.map(
    ([symbol, said]) => `<dt><span class="formula">${formulaSet(symbol)}</span></dt><dd>${said}</dd>`,
  )
  return `<!doctype html>
<html lang="en">
<head>
<meta charset="utf-8" />
<meta name="viewport" content="width=device-width, initial-scale=1" />
<meta http-equiv="Content-Security-Policy" content="default-src 'none'; style-src 'unsafe-inline'" />
<title>Counterpoise: worksheet functions</title>
<style>${STYLE}</style>
</head>
<body>
<header>
<a class="skip" href="#functions">To the functions</a>
<h1>Worksheet functions of Counterpoise</h1>
<p>They split the risk of a portfolio into what each position brings to it, in the cells of a workbook. Every figure is an estimate from the
numbers given, not advice; local rules and licensed practice come first.</p>
</header>
<nav aria-label="Contents">
<h2>Contents</h2>
<ul>
<li><a href="#cells">How cells are read</a></li>
<li><a href="#symbols">Symbols</a></li>
<li><a href="#estimators">Estimators</a></li>
<li><a href="#errors">Errors in a cell</a></li>
${links.join('\n')}
</ul>
</nav>
<main>
<h2 id="cells">How cells are read</h2>
<p>Weights are one row or one column of fractions of capital, of any sign and sum: 0.12 or 12% are the same. Results are fractions too,
and results with one number for each position lie as the weights do.</p>
<p>Risk is a block of returns per period (one row a date, newest last, one column a position) or a covariance matrix. Above returns or prices there may
be a row of names, and then beside them a column of dates: dated rows are put in order, oldest first. Columns belong to weights by their place;
${prose('BREAKDOWN', functions, null)} goes by name.</p>
<p>Figures are per period, or by the year where <code>periods_per_year</code> is given (square root of time). Arguments in square brackets may be left
out.</p>
<p>Blank cells reach a function as zeros in some versions of Excel, so a function cannot always tell a gap from a return of 0. Returns with gaps
are better read in the task pane, which reads the cells themselves.</p>
<h2 id="symbols">Symbols</h2>
<dl class="told symbols">
${symbols.join('\n')}
</dl>
<h2 id="estimators">Estimators</h2>
<p>The text of the argument <code>estimator</code>, in quotation marks where it is typed within a formula. A covariance matrix is taken as given and needs
none.</p>
<dl class="told">
${estimators.join('\n')}
</dl>
<h2 id="errors">Errors in a cell</h2>
<p>#VALUE! means that an argument is wrong, #N/A that the figure does not exist. The error card of the cell names the argument, the row and the column,
what was found there and what is needed.</p>
<dl class="told">
${faults.join('\n')}
</dl>
<h2 id="functions">The functions</h2>
${functions.map((one) => section(one, functions, comments, namespace)).join('\n')}
</main>
<footer><p>Counterpoise ${escape(version)}. Sources marked “from memory” were not looked up when the function was written.</p></footer>
</body>
</html>
`
}

module.exports = { helpPage }
