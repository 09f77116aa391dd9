import { ESLint } from 'eslint'
import { join } from 'node:path'
import config from './eslint.config.cjs'
import { judge, table } from './wall.cjs'

const root = join(__dirname, '../..')
const at = (file: string) => join(root, 'src', file)

describe('the wall between the folders of src', () => {
  it.each([
    ['core/decomposition.ts', './risk-model', false],
    ['core/kernel/plain.ts', '../fault', false],
    ['sheet/functions.ts', '../core', false],
    ['sheet/functions.ts', '../core/index', false],
    ['excel/reading.ts', '../sheet', false],
    ['pane/store.ts', '../core', false],
    ['entry/taskpane.tsx', '../pane', false],
    ['entry/functions.ts', '../excel', false],
    ['entry/desk.ts', '../desk', false],
    ['desk/functions.ts', '../sheet', true],
    ['pane/risk.tsx', 'react', false],
  ])('lets %s import %s', (importer, specifier, typesOnly) => {
    expect(judge(at(importer), specifier, typesOnly)).toBeNull()
  })

  it.each([
    ['core/a.ts', '../sheet', false, 'src/core may not import src/sheet'],
    ['core/a.ts', '../sheet', true, 'src/core may not import src/sheet'],
    ['core/kernel/a.ts', '../../sheet', false, 'src/core may not import src/sheet'],
    ['sheet/a.ts', '../excel', false, 'src/sheet may not import src/excel'],
    ['sheet/a.ts', '../pane', false, 'src/sheet may not import src/pane'],
    ['excel/a.ts', '../pane', false, 'src/excel may not import src/pane'],
    ['pane/a.tsx', '../excel', true, 'src/pane may not import src/excel'],
    ['pane/a.tsx', '../desk', false, 'src/pane may not import src/desk'],
    ['entry/taskpane.tsx', '../desk', false, 'src/entry may not import src/desk'],
    ['entry/desk.ts', '../pane', false, 'src/entry may not import src/pane'],
    ['desk/a.ts', '../sheet', false, 'src/desk may import only types from src/sheet'],
    ['desk/a.ts', '../sheet/cells', true, 'src/sheet is entered through its index.ts, not through "cells"'],
    ['sheet/a.ts', '../core/fault', false, 'src/core is entered through its index.ts, not through "fault"'],
    ['sheet/a.ts', '../core/kernel', false, 'src/core is entered through its index.ts, not through "kernel"'],
    ['sheet/a.ts', '../build/manifest.cjs', false, 'src/sheet may not import src/build'],
    [
      'sheet/a.ts',
      '../../test/unit/a',
      false,
      'src/sheet imports "../../test/unit/a", which lies outside src',
    ],
    ['shed/a.ts', '../core', false, 'src/shed has no line in the table of the wall'],
  ])('stops %s importing %s', (importer, specifier, typesOnly, sentence) => {
    expect(judge(at(importer), specifier, typesOnly)).toContain(sentence)
  })

  it('has one line in its table for every folder, and lets nobody but its entry in to the desk', () => {
    const takers = Object.entries(table).filter(([, line]) => line.values.includes('desk' as never))
    expect(takers.map(([name]) => name)).toEqual(['entry/desk'])
    expect(Object.values(table).some((line) => line.values.includes('build' as never))).toBe(false)
  })
})

describe('the lint configuration', () => {
  // Snippets are no files of the project, so nothing that needs types can be asked about them.
  const withoutTypes = {
    languageOptions: { parserOptions: { projectService: false } },
    rules: {
      '@typescript-eslint/no-floating-promises': 'off',
      '@typescript-eslint/switch-exhaustiveness-check': 'off',
    },
  } as const
  const eslint = new ESLint({
    cwd: root,
    overrideConfigFile: true,
    overrideConfig: [...config, withoutTypes],
  })
  const complaints = async (file: string, code: string) => {
    const [result] = await eslint.lintText(code, { filePath: at(file) })
    return result!.messages.map(({ ruleId, message }) => `${ruleId}: ${message}`)
  }

  it.each([
    ['an import', "import { a } from '../sheet'\na()"],
    ['a re-export', "export { a } from '../sheet'"],
    ['a re-export of all', "export * from '../sheet'"],
    ['a dynamic import', "export const a = () => import('../sheet')"],
    ['an import of types', "import type { A } from '../sheet'\nexport type B = A"],
    ['a type in place', "export type B = import('../sheet').A"],
    [
      "another folder's worker",
      "export const a = () => new Worker(new URL('../sheet/worker.ts', import.meta.url))",
    ],
  ])('sees %s that crosses the wall', async (_, code) => {
    expect(await complaints('core/snippet.ts', code)).toContain(
      'counterpoise/wall: src/core may not import src/sheet',
    )
  })

  it.each(['core', 'sheet', 'pane', 'entry'])(
    'keeps the host out of %s, as a value, as a type and by way of globalThis',
    async (folder) => {
      const told = async (code: string) => (await complaints(`${folder}/snippet.ts`, code)).join('\n')
      const sentence = 'Only src/excel speaks to the host'
      expect(await told('export const a = Office.context')).toContain(sentence)
      expect(await told('export const a = (range: Excel.Range) => range')).toContain(sentence)
      expect(await told('export const a = globalThis.CustomFunctions')).toContain(sentence)
    },
  )

  it('lets excel speak to the host', async () => {
    expect(
      await complaints(
        'excel/snippet.ts',
        'export const a = (range: Excel.Range) => [range, Office.context]',
      ),
    ).toEqual([])
  })

  it.each([
    ['core/snippet.ts', "console.log('x')", 'no-console'],
    ['pane/snippet.tsx', 'export const a = (b: any) => b', '@typescript-eslint/no-explicit-any'],
    [
      'sheet/snippet.ts',
      "import { readFileSync } from 'node:fs'\nreadFileSync('x')",
      'no-restricted-imports',
    ],
  ])('says no in %s to %s', async (file, code, rule) => {
    expect((await complaints(file, code)).map((line) => line.split(':')[0])).toContain(rule)
  })
})
