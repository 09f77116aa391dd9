import { useEffect, useRef, useState } from 'react'
import { Button, makeStyles, tokens } from '@fluentui/react-components'
import { quote, type Table } from '../sheet'
import type { PictureFile } from './picture-file'
import { useStepStyles } from './step'
import { htmlOf, textOf } from './table-copy'

const useStyles = makeStyles({
  block: { display: 'grid', rowGap: tokens.spacingVerticalXS, minWidth: 0 },
  picture: { maxWidth: '100%', height: 'auto', border: `1px solid ${tokens.colorNeutralStroke2}` },
  text: {
    boxSizing: 'border-box',
    width: '100%',
    resize: 'vertical',
    padding: tokens.spacingHorizontalS,
    border: `1px solid ${tokens.colorNeutralStrokeAccessible}`,
    borderRadius: tokens.borderRadiusMedium,
    fontFamily: tokens.fontFamilyMonospace,
    fontSize: tokens.fontSizeBase200,
    color: tokens.colorNeutralForeground1,
    backgroundColor: tokens.colorNeutralBackground1,
  },
})

const CLIPBOARD_REFUSED = 'The clipboard cannot be written to from this pane.'

/** @returns whether the host let it be written */
async function toClipboard(parts: { readonly [type: string]: Blob | Promise<Blob> }): Promise<boolean> {
  try {
    await navigator.clipboard.write([new ClipboardItem(parts)])
    return true
  } catch {
    // not offered, not allowed here, or the pane has lost the focus: all are told alike, with what can be done instead
    return false
  }
}

/** Copies a table as text and HTML; where the host does not let it, shows the text to be copied by hand, which hands over both as well. */
export function CopyTable({
  what,
  table,
  decimal,
}: {
  what: string
  table: () => Table
  /** the mark before decimals in what is typed for this workbook */
  decimal: string
}) {
  const classes = { ...useStepStyles(), ...useStyles() }
  const [outcome, setOutcome] = useState('')
  const [shown, setShown] = useState<{ readonly text: string; readonly html: string } | null>(null)
  const area = useRef<HTMLTextAreaElement>(null)
  useEffect(() => {
    area.current?.focus()
    area.current?.select()
  }, [shown])
  const copy = async (): Promise<void> => {
    const made = table()
    const [text, html] = [textOf(made, decimal), htmlOf(made)]
    const copied = await toClipboard({
      'text/plain': new Blob([text], { type: 'text/plain' }),
      'text/html': new Blob([html], { type: 'text/html' }),
    })
    setShown(copied ? null : { text, html })
    setOutcome(
      copied
        ? 'Copied: for cells with every digit, for documents as a table.'
        : `${CLIPBOARD_REFUSED} The table stands below, selected: Ctrl+C (Cmd+C) copies it.`,
    )
  }
  return (
    <div className={classes.block}>
      <div className={classes.buttons}>
        <Button size="small" onClick={() => void copy()}>
          {`Copy ${what}`}
        </Button>
      </div>
      <p className={classes.small} role="status">
        {outcome}
      </p>
      {shown && (
        <textarea
          ref={area}
          rows={6}
          readOnly
          className={classes.text}
          aria-label="Text of the table"
          value={shown.text}
          onCopy={(event) => {
            const { selectionStart, selectionEnd, value } = event.currentTarget
            if (selectionEnd - selectionStart < value.length) return
            event.clipboardData.setData('text/plain', shown.text)
            event.clipboardData.setData('text/html', shown.html)
            event.preventDefault()
          }}
        />
      )}
    </div>
  )
}

/** Pixels of a saved picture for one of its own units. */
const SHARPNESS = 2

const svgBlob = ({ svg }: PictureFile): Blob => new Blob([svg], { type: 'image/svg+xml' })

async function pngOf(file: PictureFile): Promise<Blob> {
  const url = URL.createObjectURL(svgBlob(file))
  try {
    const image = new Image()
    image.src = url
    await image.decode()
    const canvas = document.createElement('canvas')
    canvas.width = file.width * SHARPNESS
    canvas.height = file.height * SHARPNESS
    canvas.getContext('2d')?.drawImage(image, 0, 0, canvas.width, canvas.height)
    return await new Promise((resolve, reject) =>
      canvas.toBlob(
        (blob) => (blob ? resolve(blob) : reject(new Error('the picture could not be drawn'))),
        'image/png',
      ),
    )
  } finally {
    URL.revokeObjectURL(url)
  }
}

/** Hands a file to the host as a browser saves one. Nobody is told whether it was saved. */
function save(name: string, blob: Blob): void {
  const url = URL.createObjectURL(blob)
  const link = document.createElement('a')
  link.href = url
  link.download = name
  document.body.append(link)
  link.click()
  link.remove()
  // the host reads it after the press
  setTimeout(() => URL.revokeObjectURL(url), 60_000)
}

/** Saves a picture as SVG or PNG, or copies it; where neither works here, shows it to be taken by hand. */
export function SavePicture({ what, picture }: { what: string; picture: () => PictureFile }) {
  const classes = { ...useStepStyles(), ...useStyles() }
  const [outcome, setOutcome] = useState('')
  const [shown, setShown] = useState<PictureFile | null>(null)
  const saveAs = async (kind: 'svg' | 'png'): Promise<void> => {
    const file = picture()
    setShown(null)
    try {
      save(`${file.name}.${kind}`, kind === 'svg' ? svgBlob(file) : await pngOf(file))
    } catch {
      return setOutcome('This host does not draw the picture as PNG: save it as SVG instead.')
    }
    setOutcome(
      `Handed over as ${quote(`${file.name}.${kind}`)}. Where nothing was saved, this host does not let a pane save files: copy the picture instead.`,
    )
  }
  const copy = async (): Promise<void> => {
    const file = picture()
    // the picture is promised, not awaited: some hosts let the clipboard be written to only at the press itself
    const copied = await toClipboard({ 'image/png': pngOf(file) })
    setShown(copied ? null : file)
    setOutcome(
      copied
        ? 'Picture copied.'
        : `${CLIPBOARD_REFUSED} The picture stands below: its menu (right mouse button) copies or saves it.`,
    )
  }
  return (
    <div className={classes.block}>
      <div className={classes.buttons} role="group" aria-label={what}>
        <Button size="small" onClick={() => void saveAs('svg')}>
          Save as SVG
        </Button>
        <Button size="small" onClick={() => void saveAs('png')}>
          Save as PNG
        </Button>
        <Button size="small" onClick={() => void copy()}>
          Copy picture
        </Button>
      </div>
      <p className={classes.small} role="status">
        {outcome}
      </p>
      {shown && (
        <img
          className={classes.picture}
          alt={shown.alt}
          src={`data:image/svg+xml;charset=utf-8,${encodeURIComponent(shown.svg)}`}
        />
      )}
    </div>
  )
}
