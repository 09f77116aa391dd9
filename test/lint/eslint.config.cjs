const js = require('@eslint/js')
const { defineConfig } = require('eslint/config')
const reactHooks = require('eslint-plugin-react-hooks')
const tseslint = require('typescript-eslint')
const wall = require('./wall.cjs')

const globalsOf = (...names) => Object.fromEntries(names.map((name) => [name, 'readonly']))
const node = globalsOf(
  'process',
  'console',
  'Buffer',
  'URL',
  'setTimeout',
  'clearTimeout',
  'setInterval',
  'performance',
  'fetch',
)
const commonjs = globalsOf('require', 'module', 'exports', '__dirname', '__filename')

const hostGlobals = ['Excel', 'Office', 'OfficeExtension', 'CustomFunctions']
const onlyExcel = 'Only src/excel speaks to the host; go through its door.'

module.exports = defineConfig(
  { ignores: ['dist/**', 'test/reference/data/**'] },
  { linterOptions: { reportUnusedDisableDirectives: 'error' } },
  js.configs.recommended,
  {
    files: ['**/*.{ts,tsx}'],
    extends: [tseslint.configs.strict, tseslint.configs.stylistic],
    rules: {
      '@typescript-eslint/no-explicit-any': 'error',
      '@typescript-eslint/consistent-type-imports': ['error', { disallowTypeAnnotations: false }],
      '@typescript-eslint/consistent-type-definitions': 'off',
      '@typescript-eslint/consistent-indexed-object-style': 'off',
      '@typescript-eslint/no-unused-vars': ['error', { argsIgnorePattern: '^_', varsIgnorePattern: '^_$' }],
      '@typescript-eslint/ban-ts-comment': 'error',
      // `for (let i = 0; ...)` over typed arrays is the plain form in numerical code.
      '@typescript-eslint/prefer-for-of': 'off',
      // An index into a typed array that a loop bound proves is written a[i]!; noUncheckedIndexedAccess asks for it.
      '@typescript-eslint/no-non-null-assertion': 'off',
      eqeqeq: ['error', 'always', { null: 'ignore' }],
      '@typescript-eslint/triple-slash-reference': [
        'error',
        { lib: 'never', path: 'always', types: 'never' },
      ],
      'no-var': 'error',
      'prefer-const': 'error',
    },
  },
  {
    files: ['src/**/*.{ts,tsx}'],
    plugins: { counterpoise: wall.plugin },
    rules: {
      'counterpoise/wall': 'error',
      'no-console': 'error',
      'no-alert': 'error',
      'no-restricted-imports': [
        'error',
        { patterns: [{ group: ['node:*'], message: 'What ships to the host has no Node.' }] },
      ],
    },
  },
  {
    files: ['src/{core,sheet,pane,entry}/**/*.{ts,tsx}'],
    rules: {
      'no-restricted-globals': ['error', ...hostGlobals.map((name) => ({ name, message: onlyExcel }))],
      'no-restricted-syntax': [
        'error',
        ...[
          `MemberExpression[object.name=/^(globalThis|window|self)$/][property.name=/^(${hostGlobals.join('|')})$/]`,
          `TSQualifiedName[left.name=/^(${hostGlobals.join('|')})$/]`,
        ].map((selector) => ({ selector, message: onlyExcel })),
      ],
    },
  },
  {
    files: ['src/pane/**/*.{ts,tsx}'],
    plugins: { 'react-hooks': reactHooks },
    // Its other rules compile every component to look at it: half of the time of the whole run.
    rules: { 'react-hooks/rules-of-hooks': 'error', 'react-hooks/exhaustive-deps': 'error' },
  },
  {
    // Promises that nobody waits for lose their errors: the checks that need types, where they are cheap (the grid's types are not).
    files: ['src/{sheet,excel,pane,entry}/**/*.{ts,tsx}'],
    languageOptions: { parserOptions: { projectService: true } },
    rules: {
      '@typescript-eslint/no-floating-promises': 'error',
      '@typescript-eslint/switch-exhaustiveness-check': [
        'error',
        { considerDefaultExhaustiveForUnions: true },
      ],
    },
  },
  {
    files: ['**/*.cjs', 'webpack.config.js'],
    languageOptions: { sourceType: 'commonjs', globals: { ...node, ...commonjs } },
  },
  { files: ['**/*.mjs'], languageOptions: { globals: node } },
  {
    files: ['test/**/*.{ts,tsx}'],
    rules: {
      'no-restricted-syntax': [
        'error',
        {
          selector:
            'CallExpression[callee.object.name=/^(it|test|describe)$/][callee.property.name=/^(only|todo)$/]',
          message: 'A test is written and switched on.',
        },
      ],
    },
  },
)
