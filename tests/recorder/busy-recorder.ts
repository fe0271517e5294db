/** Records as fast as it can until it is killed; says on standard output how many requests came back. */
import { writeSync } from 'node:fs'
import { Recorder } from '../../src/recorder/index.js'

const recorder = new Recorder({ path: process.argv[2] })
let done = 0
await Promise.all(
  Array.from({ length: 8 }, async (_, c) => {
    const client = recorder.client(`c${c}`)
    for (;;) {
      await client.write(
        `k${c}`,
        recorder.uniqueValue(),
        () => new Promise((resolve) => setImmediate(resolve)),
      )
      if (++done % 10 === 0) writeSync(1, `${done}\n`)
    }
  }),
)
