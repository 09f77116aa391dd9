import { Link, makeStyles } from '@fluentui/react-components'

const useStyles = makeStyles({
  link: {
    fontSize: 'inherit',
    lineHeight: 'inherit',
    textDecorationLine: 'underline',
    '@media (forced-colors: active)': { color: 'LinkText' },
  },
})

/** To the help page of the worksheet functions, which lies beside the pane's own page; it opens beside the workbook. */
export function HelpLink({ children }: { children: string }) {
  const classes = useStyles()
  return (
    <Link href="help.html" target="_blank" rel="noopener" className={classes.link}>
      {children}
    </Link>
  )
}
