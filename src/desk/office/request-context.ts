/**
 * The request model of the Office JavaScript API: objects are stand-ins for things in the workbook, whatever is asked of them is queued,
 * `sync` carries the queue out in order, and only then are loaded properties there to be read.
 *
 * What the objects are is said elsewhere, in tables (`Kind`): this module knows queues and loads, not cells.
 */
import { OfficeError, type ErrorCode } from './error'

/** A property: how it is read from its target, and how it is written if it can be. */
export interface Scalar<T> {
  read(target: T): unknown
  write?(target: T, value: never): void
}

/** A property that is itself an object, such as a range's format. `null` makes it a null object. */
export interface Part<T> {
  kind(): Kind<never>
  find(target: T): unknown
}

/** A method that answers with an object. `null` is a missing item, unless the method is one of those that then give a null object. */
export interface Find<T> extends Omit<Part<T>, 'find'> {
  find(target: T, ...args: never[]): unknown
  orNull?: boolean
  /** Whether the method changes the workbook, as one that adds an item does. */
  writes?: boolean
}

/** Events of one object: the topic they are published under and, where they concern one sheet only, its id. */
export interface EventSource<T> {
  topic: string
  sheet?(target: T): string
}

/** What kind of object a stand-in is, with T its target: the thing in the workbook that an operation acts on. */
export interface Kind<T> {
  readonly name: string
  /** The object does not outlive the request or the batch it was made in, unless tracked. */
  readonly transient?: true
  /** Raises when the target is no longer there. */
  check?(target: T): void
  /** Where the target lies after rows or columns came or went; null when it went with them. */
  shift?(target: T, change: Shift): unknown
  readonly scalars?: Readonly<Record<string, Scalar<T>>>
  readonly parts?: Readonly<Record<string, Part<T>>>
  readonly finds?: Readonly<Record<string, Find<T>>>
  /** Methods that change something and answer nothing. */
  readonly acts?: Readonly<Record<string, (target: T, ...args: never[]) => void>>
  /** Methods that answer with a value, to be had after the next sync. */
  readonly answers?: Readonly<Record<string, (target: T, ...args: never[]) => unknown>>
  /** For a collection: its items. */
  readonly list?: { kind(): Kind<never>; read(target: T): readonly unknown[] }
  readonly events?: Readonly<Record<string, EventSource<T>>>
}

/** Rows or columns that came (`count` > 0) before line `at`, or went (`count` < 0) from it on. */
export interface Shift {
  readonly sheet: string
  readonly axis: 'row' | 'column'
  readonly at: number
  readonly count: number
}

/** One step of a request. Values read are handed over in one go when the whole request has succeeded. */
export interface Operation {
  readonly location: string
  readonly sort: 'find' | 'read' | 'write' | 'listen'
  /** What the operation sends, for the size of the request. */
  readonly payload: readonly unknown[]
  run(answer: (value: unknown, deliver: () => void) => void): void
}

/** What carries requests out. */
export interface Runtime {
  readonly root: unknown
  readonly rootKind: Kind<never>
  execute(
    operations: readonly Operation[],
    how: Readonly<Pick<RunOptions, 'delayForCellEdit' | 'mergeUndoGroup'>>,
  ): Promise<void>
  /** Gathers what requests do into one step of the user's undo. @returns what ends that */
  groupUndo(): () => void
  listen(listener: Listener): void
  /** @returns whether there was such a listener */
  unlisten(listener: Pick<Listener, 'topic' | 'handler' | 'context'>): boolean
  /** The open contexts: those whose objects follow their cells. */
  readonly contexts: Set<RequestContext>
}

export type Handler = (event: unknown) => unknown

export interface Listener {
  readonly topic: string
  readonly sheet: string | undefined
  readonly handler: Handler
  readonly context: RequestContext
}

type Tree = { [property: string]: Tree }

/** Behind every stand-in object, found again from it by `nodes`. */
class Node {
  readonly loaded = new Map<string, unknown>()
  readonly children = new Map<string, Node>()
  readonly object: object
  items: readonly Node[] | undefined
  /** As the client knows it, so only after a sync. */
  isNull: boolean | undefined
  /** As the workbook knows it: undefined until found, null when there is none. */
  target: unknown
  /** Why the object may still be used after its request: the batch it belongs to is running, or it is tracked. */
  held: 'batch' | 'tracked' | null
  expired = false

  constructor(
    readonly context: RequestContext,
    readonly kind: Kind<never>,
    readonly parent: Node | null,
    /** For a part, how its target is had from the parent's. */
    readonly part: Part<never> | null = null,
  ) {
    this.held = context.holds ? 'batch' : null
    this.object = standIn(this)
    nodes.set(this.object, this)
    if (kind.transient) context.transients.add(this)
  }

  /** The target, at the moment an operation needs it; null for a null object. */
  resolve(): unknown {
    if (this.expired)
      throw new OfficeError(
        'InvalidObjectPath',
        'the object was used outside the request or batch it was made in, without context.trackedObjects.add',
      )
    if (this.part && this.parent) {
      const owner = this.parent.resolve()
      this.target = owner === null ? null : this.part.find(owner as never)
    }
    if (this.target === undefined)
      throw new OfficeError('InvalidObjectPath', `${this.kind.name} was never made`)
    if (this.target !== null) this.kind.check?.(this.target as never)
    return this.target
  }

  /** The target of an operation that needs one. */
  require(): never {
    const target = this.resolve()
    if (target === null) throw new OfficeError('ItemNotFound', `the ${this.kind.name} is a null object`)
    return target as never
  }

  child(name: string, part: Part<never>): Node {
    const known = this.children.get(name)
    if (known) return known
    const made = new Node(this.context, part.kind(), this, part)
    this.children.set(name, made)
    return made
  }
}

const nodes = new WeakMap<object, Node>()

const nodeOf = (value: unknown): Node | undefined =>
  typeof value === 'object' && value !== null ? nodes.get(value) : undefined

/** Asked of any object by promises, printers and test runners; not part of the API, and so not missing from it. */
const PROBES = new Set([
  'then',
  'asymmetricMatch',
  'nodeType',
  'tagName',
  '$$typeof',
  'constructor',
  'hasAttribute',
])

function standIn(node: Node): object {
  const { kind, context } = node
  const location = (member: string) => `${kind.name}.${member}`
  const own = (table: object | undefined, member: string): boolean => !!table && Object.hasOwn(table, member)

  const queue = (
    member: string,
    sort: Operation['sort'],
    payload: readonly unknown[],
    run: Operation['run'],
  ) => {
    for (const value of payload) {
      const argument = nodeOf(value)
      if (argument && argument.context !== context)
        throw new OfficeError('InvalidRequestContext', undefined, location(member))
    }
    context.queue({ location: location(member), sort, payload, run })
  }
  const targets = (args: readonly unknown[]): never[] =>
    args.map((arg) => (nodeOf(arg)?.require() ?? arg) as never)

  function assign(member: string, value: unknown): void {
    const scalar = kind.scalars?.[member]
    if (!scalar?.write)
      throw new OfficeError('InvalidArgument', `${location(member)} cannot be set`, location(member))
    const write = scalar.write
    queue(member, 'write', [value], () => write(node.require(), value as never))
    node.loaded.set(member, value)
  }

  const common: Readonly<Record<string, unknown>> = {
    context,
    load(option?: unknown) {
      context.load(node.object, option)
      return node.object
    },
    set(properties: Record<string, unknown>) {
      for (const [member, value] of Object.entries(properties)) {
        const part = kind.parts?.[member]
        if (part) (node.child(member, part).object as { set(inner: unknown): void }).set(value)
        else assign(member, value)
      }
    },
    track() {
      context.trackedObjects.add(node.object)
      return node.object
    },
    untrack() {
      context.trackedObjects.remove(node.object)
      return node.object
    },
    toJSON: () => plain(node),
  }

  const methods = new Map<string, unknown>()
  function method(member: string): unknown {
    const find = own(kind.finds, member) ? kind.finds?.[member] : undefined
    if (find)
      return (...args: unknown[]) => {
        const made = new Node(context, find.kind(), node)
        queue(member, find.writes ? 'write' : 'find', args, (answer) => {
          const owner = node.resolve()
          const found = owner === null ? null : find.find(owner as never, ...targets(args))
          if (found === null && owner !== null && !find.orNull) throw new OfficeError('ItemNotFound')
          made.target = found
          answer(null, () => (made.isNull = found === null))
        })
        return made.object
      }
    const act = own(kind.acts, member) ? kind.acts?.[member] : undefined
    if (act)
      return (...args: unknown[]) => {
        queue(member, 'write', args, () => act(node.require(), ...targets(args)))
      }
    const ask = own(kind.answers, member) ? kind.answers?.[member] : undefined
    if (ask)
      return (...args: unknown[]) => {
        const result = new ClientResult()
        queue(member, 'read', args, (answer) => {
          const value = ask(node.require(), ...targets(args))
          answer(value, () => result.settle(value))
        })
        return result
      }
    const source = own(kind.events, member) ? kind.events?.[member] : undefined
    return source && eventHandlers(node, member, source, queue)
  }

  return new Proxy(
    {},
    {
      get(_, member) {
        if (typeof member === 'symbol' || PROBES.has(member)) return undefined
        if (member === 'isNullObject') {
          if (node.isNull === undefined) throw new OfficeError('PropertyNotLoaded', member, location(member))
          return node.isNull
        }
        if (own(kind.scalars, member)) {
          if (node.loaded.has(member)) return node.loaded.get(member)
          // A null object has no properties; the host gives undefined for those that were asked for.
          if (node.isNull) return undefined
          throw new OfficeError('PropertyNotLoaded', location(member), location(member))
        }
        const part = own(kind.parts, member) ? kind.parts?.[member] : undefined
        if (part) return node.child(member, part).object
        if (member === 'items' && kind.list) {
          if (!node.items) throw new OfficeError('PropertyNotLoaded', location(member), location(member))
          return node.items.map((item) => item.object)
        }
        if (own(common, member)) return common[member]
        if (!methods.has(member)) methods.set(member, method(member))
        const made = methods.get(member)
        if (made === undefined)
          throw new OfficeError('NotImplemented', `the desk has no ${location(member)}`, location(member))
        return made
      },
      set(_, member, value) {
        if (typeof member === 'symbol' || !own(kind.scalars, member))
          throw new OfficeError('NotImplemented', `the desk has no ${kind.name}.${String(member)} to set`)
        assign(member, value)
        return true
      },
      has: (_, member) =>
        typeof member === 'string' && (own(kind.scalars, member) || own(kind.parts, member)),
    },
  )
}

/** A value that a method answers with. */
class ClientResult {
  #settled = false
  #value: unknown

  settle(value: unknown): void {
    this.#settled = true
    this.#value = value
  }

  get value(): unknown {
    if (!this.#settled) throw new OfficeError('PropertyNotLoaded', 'ClientResult.value')
    return this.#value
  }
}

type Queue = (
  member: string,
  sort: Operation['sort'],
  payload: readonly unknown[],
  run: Operation['run'],
) => void

function eventHandlers(node: Node, member: string, source: EventSource<never>, queue: Queue): object {
  const { context } = node
  const remove = (handler: Handler) =>
    queue(member, 'listen', [], () => {
      if (!context.host.unlisten({ topic: source.topic, handler, context }))
        throw new OfficeError('InvalidOperation', 'the handler was not added in this context')
    })
  return {
    context,
    add(handler: Handler) {
      queue(member, 'listen', [], () => {
        const sheet = source.sheet?.(node.require())
        context.host.listen({ topic: source.topic, sheet, handler, context })
      })
      return { context, remove: () => remove(handler) }
    },
    remove,
  }
}

/** What has been loaded of an object, as plain data. */
function plain(node: Node): Record<string, unknown> {
  const out: Record<string, unknown> = Object.fromEntries(node.loaded)
  for (const [name, child] of node.children) {
    const data = plain(child)
    if (Object.keys(data).length) out[name] = data
  }
  if (node.items) out['items'] = node.items.map(plain)
  return out
}

/** Reads every form a load option may take: text with commas and slashes, a list of such, or an object. */
function loadTree(option: unknown): Tree {
  const tree: Tree = {}
  const add = (path: string) => {
    let at = tree
    for (const step of path.split('/').map((part) => part.trim())) {
      if (!step) throw new OfficeError('InvalidArgument', `"${path}" is no path of properties`)
      at = at[step] ??= {}
    }
  }
  if (option === undefined) return tree
  if (typeof option === 'string') option.split(',').forEach(add)
  else if (Array.isArray(option)) option.forEach((path) => Object.assign(tree, merged(tree, loadTree(path))))
  else if (typeof option === 'object' && option !== null) {
    for (const [key, value] of Object.entries(option)) {
      if (key === 'select' || key === 'expand') Object.assign(tree, merged(tree, loadTree(value)))
      else if (/^\$?(top|skip)$/.test(key)) throw new OfficeError('NotImplemented', `load with ${key}`)
      else if (value === true) tree[key] ??= {}
      else if (value !== false) tree[key] = merged(tree[key] ?? {}, loadTree(value))
    }
  } else throw new OfficeError('InvalidArgument', 'a load option is text, a list or an object')
  return tree
}

const merged = (a: Tree, b: Tree): Tree =>
  Object.entries(b).reduce((sum, [key, inner]) => ({ ...sum, [key]: merged(sum[key] ?? {}, inner) }), a)

/** Reads what `tree` asks of a node, in the middle of a request. */
function read(node: Node, tree: Tree, answer: Parameters<Operation['run']>[0]): void {
  const { kind } = node
  const target = node.resolve()
  answer(null, () => (node.isNull = target === null))
  if (target === null) return
  const wanted =
    Object.keys(tree).length || kind.list
      ? tree
      : Object.fromEntries(Object.keys(kind.scalars ?? {}).map((key) => [key, {}]))
  const ofItems: Tree = {}
  for (const [key, inner] of Object.entries(wanted)) {
    const scalar = kind.scalars?.[key]
    const part = kind.parts?.[key]
    if (scalar) {
      const value = scalar.read(target as never)
      answer(value, () => node.loaded.set(key, value))
    } else if (part) read(node.child(key, part), inner, answer)
    else if (kind.list && key === 'items') Object.assign(ofItems, merged(ofItems, inner))
    else if (kind.list) ofItems[key] = merged(ofItems[key] ?? {}, inner)
    else throw new OfficeError('InvalidArgument', `${kind.name} has no property ${key} to load`)
  }
  if (!kind.list) return
  const itemKind = kind.list.kind()
  const items = kind.list.read(target as never).map((itemTarget) => {
    const item = new Node(node.context, itemKind, node)
    item.target = itemTarget
    read(item, ofItems, answer)
    return item
  })
  answer(null, () => (node.items = items))
}

/** The host's `Excel.RequestContext`. */
export class RequestContext {
  readonly transients = new Set<Node>()
  readonly debugInfo = { pendingStatements: [] as string[] }
  /** Whether objects stay usable from one sync to the next, as within a batch. */
  holds = false
  how: Readonly<Pick<RunOptions, 'delayForCellEdit' | 'mergeUndoGroup'>> = {}
  #operations: Operation[] = []
  readonly #root: Node

  constructor(readonly host: Runtime) {
    this.#root = new Node(this, host.rootKind, null)
    this.#root.target = host.root
  }

  get workbook(): object {
    return this.#part('workbook')
  }

  get application(): object {
    return this.#part('application')
  }

  get runtime(): object {
    return this.#part('runtime')
  }

  #part(name: string): object {
    return (this.#root.object as Record<string, object>)[name] as object
  }

  readonly trackedObjects = {
    add: (objects: object | object[]) => this.#hold(objects, 'tracked'),
    remove: (objects: object | object[]) => this.#hold(objects, null),
  }

  #hold(objects: object | object[], held: Node['held']): void {
    for (const object of Array.isArray(objects) ? objects : [objects]) {
      const node = nodeOf(object)
      if (!node || node.context !== this) throw new OfficeError('InvalidRequestContext')
      node.held = held
    }
    if (held) this.host.contexts.add(this)
  }

  /** The context an object belongs to. */
  static of(object: unknown): RequestContext | undefined {
    if (object instanceof RequestContext) return object
    return nodeOf(object)?.context
  }

  queue(operation: Operation): void {
    this.#operations.push(operation)
  }

  get hasPending(): boolean {
    return this.#operations.length > 0
  }

  load(object: object, option?: unknown): void {
    const node = nodeOf(object)
    if (!node || node.context !== this) throw new OfficeError('InvalidRequestContext')
    const tree = loadTree(option)
    this.queue({
      location: `${node.kind.name}.load`,
      sort: 'read',
      payload: [],
      run: (answer) => read(node, tree, answer),
    })
  }

  /** Carries the queue out. On a rejection the operations before the failing one stand, and the rest of the queue is gone. */
  async sync<T>(passThrough?: T): Promise<T> {
    const operations = this.#operations
    this.#operations = []
    if (operations.length) {
      try {
        await this.host.execute(operations, this.how)
      } finally {
        this.expire((node) => node.held === null)
      }
    }
    return passThrough as T
  }

  /** Ends the life of the objects that are not to be used again. */
  expire(over: (node: Node) => boolean): void {
    for (const node of this.transients) {
      if (!over(node)) continue
      node.expired = true
      this.transients.delete(node)
    }
  }

  /** Ends a batch: only what was tracked can still be used. */
  close(): void {
    this.holds = false
    this.how = {}
    this.expire((node) => node.held !== 'tracked')
    if (!this.transients.size) this.host.contexts.delete(this)
  }

  /** Lets the objects follow their cells when rows or columns come or go. */
  shift(change: Shift): void {
    for (const node of this.transients) {
      if (node.part || node.target === undefined || node.target === null || !node.kind.shift) continue
      const moved = node.kind.shift(node.target as never, change)
      if (moved === null) node.expired = true
      else node.target = moved
    }
  }
}

interface RunOptions {
  readonly delayForCellEdit?: boolean
  /** one step of undo for all requests of the batch; what cannot be undone is then refused */
  readonly mergeUndoGroup?: boolean
  readonly previousObjects?: unknown
}

type Batch = (context: RequestContext) => Promise<unknown>

/** The host's `Excel.run`, in all its forms: with a batch; with options, an object or objects to go on with, and a batch. */
export async function run(runtime: Runtime, first: unknown, second?: unknown): Promise<unknown> {
  const batch = (typeof first === 'function' ? first : second) as Batch | undefined
  if (typeof batch !== 'function') throw new OfficeError('InvalidArgument', 'run needs a batch function')
  const given = typeof first === 'function' ? undefined : first
  // Options are plain; anything else is an object or objects to go on with.
  const belongs = Array.isArray(given) || RequestContext.of(given) !== undefined
  const options: RunOptions = belongs ? { previousObjects: given } : ((given ?? {}) as RunOptions)
  const { previousObjects: previous, ...how } = options
  const contexts = (Array.isArray(previous) ? previous : [previous]).map((object) =>
    RequestContext.of(object),
  )
  if (contexts.some((one) => one !== contexts[0])) throw new OfficeError('InvalidRequestContext')
  const context = contexts[0] ?? new RequestContext(runtime)
  context.holds = true
  context.how = how
  const endGroup = how.mergeUndoGroup ? runtime.groupUndo() : null
  runtime.contexts.add(context)
  try {
    const result = batch(context) as Promise<unknown> | undefined
    if (typeof result?.then !== 'function')
      throw new OfficeError('InvalidOperation', 'the batch function did not return a promise')
    const value = await result
    await context.sync()
    return value
  } finally {
    context.close()
    endGroup?.()
  }
}

/** Bytes of a value as the host would send it. */
export function payloadSize(value: unknown): number {
  if (typeof value === 'string') return value.length + 2
  if (typeof value === 'number') return String(value).length
  if (Array.isArray(value)) return value.reduce<number>((sum, item) => sum + payloadSize(item) + 1, 2)
  if (typeof value === 'object' && value !== null && !nodeOf(value))
    return Object.entries(value).reduce((sum, [key, item]) => sum + key.length + 3 + payloadSize(item), 2)
  return 5
}

export const isOfficeError = (error: unknown, code?: ErrorCode): error is OfficeError =>
  error instanceof OfficeError && (code === undefined || error.code === code)
