/** Run by `npm run schemas`. */
import { certificatePublication } from './certificate-publication.js'
import { comparisonPublication } from './comparison-publication.js'
import { dumpPublication } from './dump-publication.js'
import { freshnessPublication } from './freshness-publication.js'
import { historyPublication } from './history-publication.js'
import { mappingPublication } from './mapping-publication.js'
import { publish } from './publish.js'
import { resultPublication } from './result-publication.js'
import { scenarioPublication } from './scenario-publication.js'
import { surveyPublication } from './survey-publication.js'
import { truthPublication } from './truth-publication.js'

for (const publication of [
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
])
  publish(publication)
