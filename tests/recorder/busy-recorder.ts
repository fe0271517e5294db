/**
 * Records as fast as it can until something ends it. Its store is whoever reads its standard output: a request
 * is a line `sent VALUE` there, and `done VALUE` is said once the recorded call has returned.
 *
 *   busy-recorder FILE OPTIONS [exit | throw]
 *
 * OPTIONS are the recorder's, as JSON. With `exit` or `throw` it ends by itself that way after 500 requests,
 * without closing the recorder; it also ends when it can record no more, and says why.
 */
import { writeSync } from 'node:fs'
import { Recorder } from '../../src/recorder/index.js'

const [file, options, ending] = process.argv.slice(2)
const recorder = new Recorder({ path: file, ...JSON.parse(options) })
let sent = 0

async function drive(c: number): Promise<void> {
  const client = recorder.client(`c${c}`)
  for (;;) {
    const value = recorder.uniqueValue()
    await client.write(`k${c}`, value, async () => {
      writeSync(1, `sent ${value}\n`)
      if (++sent === 500 && ending === 'exit') process.exit(0)
      if (sent === 500 && ending === 'throw')
        setImmediate(() => Promise.reject(new Error('as it was asked to')))
      await new Promise((resolve) => setImmediate(resolve))
    })
    writeSync(1, `done ${value}\n`)
  }
}

try {
  await Promise.all(Array.from({ length: 8 }, (_, c) => drive(c)))
} catch (error) {
  writeSync(1, `cannot ${(error as Error).message}\n`)
  process.exit(3)
}
