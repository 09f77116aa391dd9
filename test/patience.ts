/** A machine that does other things too takes its time; what hangs still ends. Files that wait for more say so themselves. */
jest.setTimeout(30_000)
