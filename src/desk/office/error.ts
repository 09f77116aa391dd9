/** The codes the host documents and this stand-in raises. */
export type ErrorCode =
  | 'AccessDenied'
  | 'GeneralException'
  | 'InvalidArgument'
  | 'InvalidObjectPath'
  | 'InvalidOperation'
  | 'InvalidOperationInCellEditMode'
  | 'InvalidReference'
  | 'InvalidRequestContext'
  | 'InvalidSelection'
  | 'ItemAlreadyExists'
  | 'ItemNotFound'
  | 'NotImplemented'
  | 'PropertyNotLoaded'
  | 'RangeExceedsLimit'
  | 'RequestPayloadSizeLimitExceeded'
  | 'ResponsePayloadSizeLimitExceeded'
  | 'UndoNotSupported'

const MESSAGE: Readonly<Record<ErrorCode, string>> = {
  AccessDenied: 'You cannot perform the requested operation.',
  GeneralException: 'There was an internal error while processing the request.',
  InvalidArgument: 'The argument is invalid or missing or has an incorrect format.',
  InvalidObjectPath: 'The object path is not working for what you are trying to do.',
  InvalidOperation: 'The operation attempted is invalid on the object.',
  InvalidOperationInCellEditMode:
    'Excel is in cell-editing mode. Please exit the edit mode by pressing ENTER or TAB or selecting another cell, and then try again.',
  InvalidReference: 'This reference is not valid for the current operation.',
  InvalidRequestContext: 'Cannot use the object across different request contexts.',
  InvalidSelection: 'The current selection is invalid for this operation.',
  ItemAlreadyExists: 'The resource being created already exists.',
  ItemNotFound: 'The requested resource does not exist.',
  NotImplemented: 'The requested feature is not implemented.',
  PropertyNotLoaded:
    'The property is not available. Before reading the property\'s value, call the load method on the containing object and call "context.sync()" on the associated request context.',
  RangeExceedsLimit: 'The cell count in the range has exceeded the maximum supported number.',
  RequestPayloadSizeLimitExceeded: 'The request payload size has exceeded the limit.',
  ResponsePayloadSizeLimitExceeded: 'The response payload size has exceeded the limit.',
  UndoNotSupported: 'The operation cannot be undone together with others.',
}

/** What a rejected sync carries; the host's `OfficeExtension.Error`. */
export class OfficeError extends Error {
  override readonly name = 'RichApi.Error'
  readonly debugInfo: { code: string; message: string; errorLocation?: string }
  readonly traceMessages: string[] = []

  constructor(
    readonly code: ErrorCode,
    detail = '',
    location?: string,
  ) {
    super(detail ? `${MESSAGE[code]} (${detail})` : MESSAGE[code])
    this.debugInfo = { code, message: this.message, ...(location ? { errorLocation: location } : {}) }
  }

  /** The same error, saying at which member of which object it arose, unless it says so already. */
  at(location: string): this {
    this.debugInfo.errorLocation ??= location
    return this
  }
}
