/**
 * Formulas as a file stores them and as a user reads them.
 *
 * A file marks functions newer than the format (`_xlfn.XLOOKUP`, `_xlfn._xlws.FILTER`), the variables of LET and LAMBDA (`_xlpm.x`) and
 * an add-in's functions (`_xldudf_POISE_RETURNS` for POISE.RETURNS); none of that is shown.
 *
 * Source, from memory: [MS-XLSX] 2.2.2 "Formulas", future-function-list and prefixes; the add-in form is as the host writes it (common
 * practice, no source).
 */
import { NEW_EXCEL_FUNCTIONS } from '@univerjs/engine-formula'

// A text literal, a quoted sheet name, or a word that may be a function, a variable or a reference.
const TOKEN = /"(?:[^"]|"")*"|'(?:[^']|'')*'|[\p{L}_\\][\p{L}\p{N}_.\\]*/gu
// These two carry a second prefix.
const WORKSHEET_ONLY = new Set(['FILTER', 'SORT'])
// Newer than the format and missing from the engine's own list.
const ALSO_NEW = new Set([
  'LET',
  'LAMBDA',
  'MAP',
  'REDUCE',
  'SCAN',
  'MAKEARRAY',
  'BYROW',
  'BYCOL',
  'ISOMITTED',
  'STDEV.S',
  'STDEV.P',
])
const STATISTICAL_2010 =
  /^(?:VAR|STDEV|COVARIANCE|MODE|PERCENTILE|QUARTILE|PERCENTRANK|RANK|CONFIDENCE|NORM|T|F|CHISQ|BETA|GAMMA|GAMMALN|LOGNORM|WEIBULL|EXPON|POISSON|BINOM|NEGBINOM|HYPGEOM|Z)\.[A-Z.\d]+$/
const ADD_IN = /^_xldudf_([A-Za-z\d]+)_(.+)$/

/** `=POISE.RETURNS(…)` from a stored formula without its equals sign. */
export function shownFormula(stored: string): string {
  return `=${eachWord(stored, (word) =>
    word
      .replace(/^(?:_xlfn\.|_xlws\.|_xlpm\.|_xludf\.)+/i, '')
      .replace(ADD_IN, (_, namespace: string, name: string) => `${namespace}.${name}`),
  )}`
}

/** The stored form, without the equals sign; `addIn` tells which functions an add-in brought. */
export function storedFormula(shown: string, addIn: (name: string) => boolean): string {
  const variables = variablesOf(shown)
  return eachWord(shown.replace(/^=/, ''), (word, called) => {
    const name = word.toUpperCase()
    if (!called) return variables.has(name) ? `_xlpm.${word}` : word
    if (addIn(name)) return `_xldudf_${name.replaceAll('.', '_')}`
    if (variables.has(name)) return `_xlpm.${word}`
    if (!isNewer(name)) return word
    return `_xlfn.${WORKSHEET_ONLY.has(name) ? '_xlws.' : ''}${name}`
  })
}

/**
 * Whether a formula has to be stored as an array formula to mean the same in a file: stored plainly, a block where one value is expected
 * is cut down to one of its cells.
 */
export function needsArray(shown: string, addIn: (name: string) => boolean): boolean {
  let found = false
  const bare = eachWord(shown, (word, called) => {
    const name = word.toUpperCase()
    if (called && (addIn(name) || NEW_EXCEL_FUNCTIONS.has(name) || ALSO_NEW.has(name))) found = true
    return word
  }).replace(/"(?:[^"]|"")*"/g, '""')
  const block = String.raw`\$?[A-Za-z]{1,3}\$?\d+:\$?[A-Za-z]{1,3}\$?\d+`
  const operator = String.raw`\s*[-+*/^&<>=]`
  return found || new RegExp(`${block}${operator}|[-+*/^&<>]\\s*(?:[^()+*/^&<>=,-]*!)?${block}`).test(bare)
}

const isNewer = (name: string): boolean =>
  NEW_EXCEL_FUNCTIONS.has(name) || ALSO_NEW.has(name) || STATISTICAL_2010.test(name)

function eachWord(formula: string, rewrite: (word: string, called: boolean) => string): string {
  return formula.replace(TOKEN, (token, at: number) => {
    if (token.startsWith('"') || token.startsWith("'")) return token
    const next = formula.slice(at + token.length)
    // A sheet's name, or a column of a table, is nobody's function.
    if (next.startsWith('!') || formula[at - 1] === '[') return token
    return rewrite(token, /^\s*\(/.test(next))
  })
}

/** The names that LET and LAMBDA introduce anywhere in the formula, in capitals. */
function variablesOf(formula: string): Set<string> {
  const names = new Set<string>()
  for (const call of formula.matchAll(/\b(LET|LAMBDA)\s*\(/gi)) {
    const args = argumentsAt(formula, call.index + call[0].length)
    const isVariable = (i: number): boolean => (/^let$/i.test(call[1] ?? '') ? i % 2 === 0 : true)
    args.slice(0, -1).forEach((argument, i) => {
      if (isVariable(i) && /^[\p{L}_][\p{L}\p{N}_.]*$/u.test(argument.trim()))
        names.add(argument.trim().toUpperCase())
    })
  }
  return names
}

function argumentsAt(formula: string, start: number): string[] {
  const args: string[] = []
  let depth = 0
  let from = start
  for (let at = start; at < formula.length; at++) {
    const char = formula[at]
    if (char === '"') at = formula.indexOf('"', at + 1) < 0 ? formula.length : formula.indexOf('"', at + 1)
    else if (char === '(' || char === '{') depth++
    else if ((char === ')' || char === '}') && depth > 0) depth--
    else if (char === ')' || (char === ',' && depth === 0)) {
      args.push(formula.slice(from, at))
      from = at + 1
      if (char === ')') break
    }
  }
  return args
}
