/** Run by `npm run schemas`. */
import { historyPublication } from './history-publication.js'
import { publish } from './publish.js'
import { resultPublication } from './result-publication.js'
import { surveyPublication } from './survey-publication.js'

for (const publication of [historyPublication, resultPublication, surveyPublication]) publish(publication)
