/** What the runner and its worker processes use of the harness, in one bundle. */
export { ALL_FLOWS, caseName, USUAL } from './cases';
export { measureCase } from './measure-case';
export { addPool, emptyPool, summarise } from './risk-pool';
