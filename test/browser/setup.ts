import { unpackChromium } from './chromium'

export default async function setup(): Promise<void> {
  await unpackChromium()
}
