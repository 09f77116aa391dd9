import { refresh } from '../../src/build/bundles.cjs'
import { unpackChromium } from './chromium'

/** Browser tests look at what ships: the production bundles, made anew where they are older than their sources. */
export default async function setup(): Promise<void> {
  await unpackChromium()
  await refresh(['addin', 'functions', 'desk'])
}
