/**
 * One seed for all properties, so that a run can be repeated; MISREAD_SEED=random (or a number) looks elsewhere.
 */
import fc from 'fast-check'

const { MISREAD_SEED } = process.env
if (MISREAD_SEED !== 'random') fc.configureGlobal({ seed: Number(MISREAD_SEED ?? 20_240_701) })
