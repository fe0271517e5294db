/**
 * One time that a fault of the scenario strikes.
 */
import type { FaultSpec } from './scenario-schema.js'

export interface FaultRun {
  /** place in the scenario's list, from 1 */
  readonly number: number
  readonly spec: FaultSpec
}
