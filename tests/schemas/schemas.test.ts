import { describe, expect, it } from 'vitest'
import { certificatePublication } from './certificate-publication.js'
import { comparisonPublication } from './comparison-publication.js'
import { dumpPublication } from './dump-publication.js'
import { freshnessPublication } from './freshness-publication.js'
import { historyPublication } from './history-publication.js'
import { mappingPublication } from './mapping-publication.js'
import { published, schemaText } from './publish.js'
import { resultPublication } from './result-publication.js'
import { scenarioPublication } from './scenario-publication.js'
import { surveyPublication } from './survey-publication.js'
import { truthPublication } from './truth-publication.js'

describe('the published JSON Schemas', () => {
  it.each([
    certificatePublication,
    comparisonPublication,
    dumpPublication,
    freshnessPublication,
    historyPublication,
    mappingPublication,
    resultPublication,
    scenarioPublication,
    surveyPublication,
    truthPublication,
  ])('$file is what the code defines', (publication) => {
    expect(published(publication), 'run npm run schemas').toBe(schemaText(publication))
  })
})
