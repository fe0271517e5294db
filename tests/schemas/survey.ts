/** Run by `npm run schemas`. */
import { publish } from './publish.js'
import { surveyPublication } from './survey-publication.js'

publish(surveyPublication)
