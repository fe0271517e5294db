/**
 * `misread/recorder`: record the requests of your own clients as a history.
 *
 * @example
 * const recorder = new Recorder({ path: 'drill.ndjson' })
 * const gate = recorder.client('gate-1')
 * await gate.write('berth/2', 'MV Alma', () => store.set('berth/2', 'MV Alma'))
 * await gate.read('berth/2', () => store.get('berth/2'))
 * recorder.close()
 */
export { type CasAnswer, type OperationOptions, RecordingClient, type WriteOptions } from './client.js'
export { Recorder, type RecorderOptions } from './recorder.js'
export type { RecordableValue } from './values.js'
