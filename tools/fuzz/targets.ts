import type { Target } from './fuzzer.js';
import { handInput, multicastFrame, packedValue, pageMessage, recordingFile, requestHead } from './targets/bytes.js';
import { links } from './targets/links.js';
import {
  benchFile,
  candumpLog,
  csvTrace,
  databaseFile,
  quantityText,
  requirementText,
  scenarioFile,
} from './targets/texts.js';

/** Every decoder and parser that reads what may come from a stranger. */
export async function allTargets(): Promise<Target[]> {
  return [
    ...(await links()),
    multicastFrame,
    packedValue,
    recordingFile,
    pageMessage,
    requestHead,
    handInput,
    candumpLog,
    databaseFile,
    requirementText,
    quantityText,
    csvTrace,
    scenarioFile,
    benchFile,
  ];
}
