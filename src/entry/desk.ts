import { openDesk } from '../desk'

const container = document.querySelector<HTMLElement>('#desk')
if (!container) throw new Error('desk.html has no place for the desk')
const workspace = await openDesk(container, {
  demoUrl: 'assets/demo.xlsx',
  functionsMetadataUrl: 'functions.json',
  paneUrl: 'taskpane.html',
  namespace: 'POISE',
})
// For the console and for whoever drives the desk from outside.
Object.assign(globalThis, { workspace })
