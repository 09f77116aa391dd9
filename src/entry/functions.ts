import { associateFunctions } from '../excel'
import { worksheetFunctions } from '../sheet'

associateFunctions(worksheetFunctions)
