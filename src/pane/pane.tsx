import { lazy, StrictMode, Suspense, useEffect, useState, type KeyboardEvent } from 'react'
import { createRoot } from 'react-dom/client'
import {
  Button,
  FluentProvider,
  makeStyles,
  mergeClasses,
  MessageBar,
  MessageBarActions,
  MessageBarBody,
  Select,
  Tab,
  TabList,
  tokens,
} from '@fluentui/react-components'
import { Dismiss16Regular } from '@fluentui/react-icons'
import { CAUTION, type Books } from '../sheet'
import { DataView } from './data'
import { HelpLink } from './help-link'
import { Sentence } from './place'
import { RiskView } from './risk'
import { StatusLine } from './status'
import { BooksProvider, useBooks, useBooksState } from './store'
import { useLook, type HostTheme } from './theme'

// Nobody begins with these.
const TradesView = lazy(() => import('./trades'))
const ReportView = lazy(() => import('./report'))

/** What the pane asks of the host it stands in. */
export interface PaneHost {
  /** what the host says about its colours; null where it says nothing */
  theme(): HostTheme | null
  /** @returns a function that ends the watch */
  onThemeChange(listener: () => void): () => void
  readonly version: string
}

const useStyles = makeStyles({
  // The whole window of the pane, whatever margins its page has.
  provider: { position: 'fixed', inset: 0 },
  light: { colorScheme: 'light' },
  dark: { colorScheme: 'dark' },
  pane: {
    height: '100%',
    minWidth: '300px',
    display: 'grid',
    gridTemplateRows: 'auto minmax(0, 1fr) auto auto',
    fontSize: tokens.fontSizeBase300,
    lineHeight: tokens.lineHeightBase300,
    color: tokens.colorNeutralForeground1,
    backgroundColor: tokens.colorNeutralBackground1,
  },
  books: { padding: `${tokens.spacingVerticalS} ${tokens.spacingHorizontalM} 0` },
  title: {
    position: 'absolute',
    width: '1px',
    height: '1px',
    overflow: 'hidden',
    clipPath: 'inset(50%)',
    margin: 0,
  },
  main: { minHeight: 0 },
  view: {
    boxSizing: 'border-box',
    height: '100%',
    overflowY: 'auto',
    // The room of the scroll bar is kept, so that a longer view does not narrow what is read.
    scrollbarGutter: 'stable',
    scrollbarWidth: 'thin',
    padding: `${tokens.spacingVerticalL} ${tokens.spacingHorizontalS} ${tokens.spacingVerticalXXL} ${tokens.spacingHorizontalL}`,
    ':focus-visible': { outline: `2px solid ${tokens.colorStrokeFocus2}`, outlineOffset: '-2px' },
  },
  // Docked below the view: when a message comes, nothing that is being read or pressed moves.
  messages: { display: 'grid', maxHeight: '40vh', overflowY: 'auto' },
  opening: {
    padding: `${tokens.spacingVerticalL} ${tokens.spacingHorizontalL}`,
    color: tokens.colorNeutralForeground2,
  },
  message: { borderRadius: 0, borderLeftWidth: 0, borderRightWidth: 0, borderBottomWidth: 0 },
  messageText: { fontSize: tokens.fontSizeBase200, lineHeight: tokens.lineHeightBase200 },
  foot: {
    display: 'flex',
    justifyContent: 'space-between',
    alignItems: 'end',
    columnGap: tokens.spacingHorizontalM,
    padding: `${tokens.spacingVerticalXS} ${tokens.spacingHorizontalM}`,
    borderTop: `1px solid ${tokens.colorNeutralStroke2}`,
    fontSize: tokens.fontSizeBase100,
    lineHeight: tokens.lineHeightBase100,
    color: tokens.colorNeutralForeground3,
  },
  version: { flexShrink: 0 },
})

const VIEWS = { data: 'Data', risk: 'Risk', trades: 'Trades', report: 'Report' } as const
type View = keyof typeof VIEWS

function BookPicker() {
  const books = useBooks()
  const classes = useStyles()
  const state = useBooksState()
  if (state.books.length < 2) return null
  return (
    <div className={classes.books}>
      <Select
        size="small"
        aria-label="Book"
        value={state.current}
        onChange={(_, { value }) => void books.switchTo(value)}
      >
        {state.books.map(({ id, title }) => (
          <option key={id} value={id}>
            {title}
          </option>
        ))}
      </Select>
    </div>
  )
}

/** A line about what just happened, until it is put away. Drawn anew for each, so that the same words show again the next time. */
function Notice({ text }: { text: string }) {
  const classes = useStyles()
  const [shown, setShown] = useState(true)
  if (!shown) return null
  return (
    <MessageBar intent="info" layout="multiline" className={classes.message}>
      <MessageBarBody className={classes.messageText}>
        <Sentence text={text} />
      </MessageBarBody>
      <MessageBarActions
        containerAction={
          <Button
            size="small"
            appearance="transparent"
            aria-label="Dismiss"
            icon={<Dismiss16Regular />}
            onClick={() => setShown(false)}
          />
        }
      />
    </MessageBar>
  )
}

/** What just happened and what could be done: never a dialog, never in the way of the keyboard. */
function Messages() {
  const classes = useStyles()
  const { notice, offers } = useBooksState()
  return (
    <div className={classes.messages} aria-live="polite">
      {offers.map((offer) => (
        <MessageBar key={offer.sentence} intent="info" layout="multiline" className={classes.message}>
          <MessageBarBody className={classes.messageText}>
            <Sentence text={offer.sentence} />
          </MessageBarBody>
          <MessageBarActions>
            <Button size="small" onClick={() => void offer.accept()}>
              {offer.button}
            </Button>
            <Button size="small" appearance="subtle" onClick={() => offer.decline()}>
              Not now
            </Button>
          </MessageBarActions>
        </MessageBar>
      ))}
      {notice !== null && <Notice key={notice} text={notice} />}
    </div>
  )
}

/**
 * The row of tabs. Fluent's own arrow keys set hidden focus stops around a tab list, which screen readers' checkers rightly report, so
 * its hook is taken off and the arrows are ours: they move and show at once, as showing a view costs nothing.
 */
function Views({ view, show }: { view: View; show: (view: View) => void }) {
  const step = (event: KeyboardEvent): void => {
    const views = Object.keys(VIEWS) as View[]
    const at = views.indexOf(view)
    const places: { readonly [key: string]: number } = {
      ArrowRight: (at + 1) % views.length,
      ArrowLeft: (at + views.length - 1) % views.length,
      Home: 0,
      End: views.length - 1,
    }
    const next = views[places[event.key] ?? -1]
    if (!next) return
    event.preventDefault()
    show(next)
    document.getElementById(`tab-${next}`)?.focus()
  }
  return (
    <TabList
      data-tabster={undefined}
      aria-label="Views"
      selectedValue={view}
      onTabSelect={(_, { value }) => {
        if (value === 'data' || value === 'risk' || value === 'trades' || value === 'report') show(value)
      }}
      onKeyDown={step}
    >
      {Object.entries(VIEWS).map(([key, label]) => (
        <Tab key={key} id={`tab-${key}`} value={key} tabIndex={key === view ? 0 : -1} aria-controls="view">
          {label}
        </Tab>
      ))}
    </TabList>
  )
}

function Pane({ version }: { version: string }) {
  const books = useBooks()
  const classes = useStyles()
  const { holdings, returns, linked } = useBooksState()
  const [view, setView] = useState<View>(linked ? 'risk' : 'data')
  const canCompute = linked || (holdings !== null && returns !== null)
  const compute = async (): Promise<void> => {
    if (!canCompute) return
    await books.compute()
    const { status, breakdown } = books.state()
    if (breakdown && status.kind === 'up to date')
      setView((current) => (current === 'data' ? 'risk' : current))
  }
  // On the window: the keys work wherever the focus is, also where a button that just went away has left it.
  useEffect(() => {
    const press = (event: globalThis.KeyboardEvent): void => {
      if (event.key !== 'Enter' || !(event.ctrlKey || event.metaKey)) return
      event.preventDefault()
      void compute()
    }
    addEventListener('keydown', press)
    return () => removeEventListener('keydown', press)
  })
  return (
    <div className={classes.pane}>
      <header>
        <h1 className={classes.title}>Counterpoise</h1>
        <BookPicker />
        <Views view={view} show={setView} />
        <StatusLine compute={() => void compute()} canCompute={canCompute} />
      </header>
      <main className={classes.main}>
        <div
          // each view begins at its top
          key={view}
          id="view"
          role="tabpanel"
          aria-labelledby={`tab-${view}`}
          className={classes.view}
          tabIndex={0}
        >
          {view === 'data' && <DataView />}
          {view === 'risk' && <RiskView />}
          <Suspense>
            {view === 'trades' && <TradesView />}
            {view === 'report' && <ReportView />}
          </Suspense>
        </div>
      </main>
      <Messages />
      <footer className={classes.foot}>
        <span>{CAUTION}</span>
        <span className={classes.version}>
          <HelpLink>Help</HelpLink> · Version {version}
        </span>
      </footer>
    </div>
  )
}

/** The books as soon as they are open. Who opens them tells what went wrong. */
function useOpened(opening: Promise<Books>): Books | null {
  const [books, setBooks] = useState<Books | null>(null)
  useEffect(() => {
    let asked = true
    opening.then(
      (opened) => asked && setBooks(opened),
      () => undefined,
    )
    return () => {
      asked = false
    }
  }, [opening])
  return books
}

function ThemedPane({ opening, host }: { opening: Promise<Books>; host: PaneHost }) {
  const books = useOpened(opening)
  const classes = useStyles()
  const { theme, scheme } = useLook(
    () => host.theme(),
    (listener) => host.onThemeChange(listener),
  )
  return (
    <FluentProvider theme={theme} className={mergeClasses(classes.provider, classes[scheme])}>
      {books ? (
        <BooksProvider books={books}>
          <Pane version={host.version} />
        </BooksProvider>
      ) : (
        <div className={classes.opening} role="status">
          Opening the workbook…
        </div>
      )}
    </FluentProvider>
  )
}

/**
 * Draws the task pane into an element and keeps it in step with the books until the returned function is called. It is there before the
 * books are open; where they cannot be opened it goes on waiting, and whoever opens them takes it away and says why.
 *
 * @param root  what stands in it is replaced; the pane fills the whole window
 */
export function openPane(root: HTMLElement, opening: Promise<Books>, host: PaneHost): () => void {
  const drawn = createRoot(root)
  drawn.render(
    <StrictMode>
      <ThemedPane opening={opening} host={host} />
    </StrictMode>,
  )
  return () => drawn.unmount()
}
