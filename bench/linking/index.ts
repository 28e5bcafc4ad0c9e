/** What the runner and its worker processes use of the harness, in one bundle. */
export { barOf, judgeRisk } from './bars';
export { ALL_FLOWS, caseName, casesOf, SET_NAMES, USUAL, unusual } from './cases';
export { FLOW_CASES } from './flows';
export { measureCase } from './measure-case';
export { addPool, emptyPool, summarise } from './risk-pool';
