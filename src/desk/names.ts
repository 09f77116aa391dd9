/** Formulas that use a name follow it when the name comes, changes or goes. */
import { ICommandService, IUniverInstanceService, UniverInstanceType, type Univer } from '@univerjs/core'
import type { FUniver } from '@univerjs/core/facade'
import {
  FormulaDataModel,
  IFunctionService,
  LexerTreeBuilder,
  RemoveDefinedNameMutation,
  SetDefinedNameMutation,
} from '@univerjs/engine-formula'

/**
 * The engine keeps what it made of each formula's text, an unknown name in it as an error, and looks at that alone from then on, even in
 * another workbook. Here it is made to forget: all texts when a workbook closes, those with the name when a name changes, which are
 * then calculated anew.
 */
export function followNames(univer: Univer, api: FUniver): void {
  const injector = univer.__getInjector()
  // disposing of the builder of syntax trees is how its caches are emptied; it goes on working
  const forgetTexts = (): void => injector.get(LexerTreeBuilder).dispose()
  injector
    .get(IUniverInstanceService)
    .getTypeOfUnitDisposed$(UniverInstanceType.UNIVER_SHEET)
    .subscribe(forgetTexts)
  injector.get(ICommandService).onCommandExecuted(({ id, params }) => {
    if (id !== SetDefinedNameMutation.id && id !== RemoveDefinedNameMutation.id) return
    const { name } = params as { name: string }
    const users = formulasWith(injector.get(FormulaDataModel), name)
    if (users.length === 0) return
    forgetTexts()
    injector.get(IFunctionService).deleteFormulaAstCacheKey(...users)
    api.getFormula().executeCalculation()
  })
}

/** The formulas whose text holds a name, however they spell it. */
function formulasWith(model: FormulaDataModel, name: string): string[] {
  const sought = name.toLowerCase()
  const found = new Set<string>()
  for (const sheets of Object.values(model.getFormulaData()))
    for (const rows of Object.values(sheets ?? {}))
      for (const cells of Object.values(rows ?? {}))
        for (const cell of Object.values(cells as Record<string, { f?: string } | null>))
          if (cell?.f?.toLowerCase().includes(sought)) found.add(cell.f)
  return [...found]
}
