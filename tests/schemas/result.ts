/** Run by `npm run schemas`. */
import { publish } from './publish.js'
import { resultPublication } from './result-publication.js'

publish(resultPublication)
