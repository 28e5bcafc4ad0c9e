// Holds the import directions of the house: cli -> tracker <- web-viewer, and inside tracker
// workers -> trust -> pipeline -> stages -> math -> core. Run alone it prints what breaks them and exits 1.
import { readdirSync, readFileSync } from 'node:fs';
import { dirname, join, posix, relative, sep } from 'node:path';
import { fileURLToPath, pathToFileURL } from 'node:url';
import ts from 'typescript';

const STAGES = [
  'detections',
  'noise',
  'linking',
  'kinematics',
  'screening',
  'eulerian',
  'fields',
  'lines',
  'synthesis',
  'store',
  'figures',
  'run',
];

/** Height of each folder of the tracker: imports go to lower heights or stay inside the folder. */
const HEIGHT = { core: 0, math: 1, pipeline: 3, trust: 4, workers: 5, node: 6 };
for (const stage of STAGES) HEIGHT[stage] = 2;

/** Modules that hold only contracts between stages: anyone may import their types, nothing but types. */
const CONTRACTS = new Set(['detections/dump', 'run/settings', 'eulerian/grid', 'store/run-record', 'pipeline/stages']);

/** The one stage that leans on another: fitting screens in between, since screened samples take no part in the fit. */
const LEANS = new Set(['kinematics -> screening']);

/** Files of the tracker that run in Node only: all of node/, and the Node halves of the worker entry. */
const isNodeOnly = (path) => path.startsWith('node/') || /^workers\/[^/]*-node\.ts$/.test(path);

/**
 * Every import of a TypeScript source: specifier, line, and whether only types come over.
 * @param {string} text
 * @param {string} name
 */
export function importsOf(text, name = 'file.ts') {
  const source = ts.createSourceFile(name, text, ts.ScriptTarget.ES2022, true);
  const found = [];
  const add = (node, specifier, typeOnly) =>
    found.push({ specifier, typeOnly, line: source.getLineAndCharacterOfPosition(node.getStart()).line + 1 });
  const visit = (node) => {
    if (ts.isImportDeclaration(node) && ts.isStringLiteral(node.moduleSpecifier)) {
      add(node, node.moduleSpecifier.text, importIsTypeOnly(node.importClause));
    } else if (ts.isExportDeclaration(node) && node.moduleSpecifier !== undefined) {
      const elements = node.exportClause !== undefined && ts.isNamedExports(node.exportClause);
      const typed = node.isTypeOnly || (elements && node.exportClause.elements.every((e) => e.isTypeOnly));
      add(node, node.moduleSpecifier.text, typed);
    } else if (ts.isCallExpression(node) && node.expression.kind === ts.SyntaxKind.ImportKeyword) {
      if (node.arguments.length > 0 && ts.isStringLiteral(node.arguments[0])) add(node, node.arguments[0].text, false);
    } else if (ts.isImportTypeNode(node) && ts.isLiteralTypeNode(node.argument)) {
      add(node, node.argument.literal.text, true);
    }
    ts.forEachChild(node, visit);
  };
  visit(source);
  return found;
}

function importIsTypeOnly(clause) {
  if (clause === undefined) return false;
  if (clause.isTypeOnly) return true;
  if (clause.name !== undefined || clause.namedBindings === undefined) return false;
  return ts.isNamedImports(clause.namedBindings) && clause.namedBindings.elements.every((e) => e.isTypeOnly);
}

/**
 * What is wrong with one import, or null.
 * @param {string} file path below packages/, with forward slashes: `tracker/src/linking/reach.ts`
 * @param {{ specifier: string, typeOnly: boolean }} one
 */
export function directionFault(file, one) {
  const [home, , ...rest] = file.split('/');
  const inside = rest.join('/');
  const { specifier } = one;
  if (specifier.startsWith('@wakeloom/')) {
    const other = specifier.split('/')[1];
    if (home === 'tracker') return `the tracker imports nothing of @wakeloom by name (relative paths inside it)`;
    if (other !== 'tracker' && other !== home) return `${home} may import the tracker only, not ${other}`;
    if (home === 'web-viewer' && /^@wakeloom\/tracker\/node(\/|$)/.test(specifier))
      return 'the viewer runs in browsers and may not import the Node-only entry';
    return null;
  }
  if (!specifier.startsWith('.')) {
    if (home === 'tracker' && specifier.startsWith('node:') && !isNodeOnly(inside))
      return `only node/ and workers/*-node.ts import Node modules (the rest runs in browsers too)`;
    if (home === 'web-viewer' && specifier.startsWith('node:')) return 'the viewer runs in browsers: no Node modules';
    return null;
  }
  const target = posix.normalize(posix.join(posix.dirname(file), specifier));
  if (!target.startsWith(`${home}/`)) return `a relative import may not leave its package (it reaches ${target})`;
  return home === 'tracker' ? trackerFault(inside, target.slice('tracker/src/'.length), one) : null;
}

function trackerFault(inside, target, one) {
  const from = inside.includes('/') ? inside.split('/')[0] : 'index';
  const to = target.split('/')[0];
  if (from === 'index') return to === 'node' ? 'the root entry is browser-safe and may not import node/' : null;
  if (!(to in HEIGHT)) return `nothing inside the tracker imports ${target}`;
  if (!(from in HEIGHT)) return `folder ${from}/ has no place in the house (scripts/check-directions.mjs)`;
  if (from === to) return null;
  if (CONTRACTS.has(target.replace(/\.(js|ts)$/, ''))) {
    if (one.typeOnly || HEIGHT[from] > HEIGHT[to]) return null;
    return `${target} is a contract: import its types only (import type)`;
  }
  if (HEIGHT[from] > HEIGHT[to] && !(to === 'node' && !isNodeOnly(inside))) return null;
  if (to === 'node' && isNodeOnly(inside)) return null;
  if (LEANS.has(`${from} -> ${to}`)) return null;
  if (HEIGHT[from] === HEIGHT[to]) return `a stage may not import a sibling stage (${from} -> ${to})`;
  return `${from} may not import ${to} (workers -> trust -> pipeline -> stages -> math -> core)`;
}

/**
 * All faults below a packages folder, as `path:line: import of "x": why`.
 * @param {string} packagesFolder
 */
export function checkDirections(packagesFolder) {
  const faults = [];
  for (const name of ['tracker', 'cli', 'web-viewer']) {
    for (const path of sourcesBelow(join(packagesFolder, name, 'src'))) {
      const file = relative(packagesFolder, path).split(sep).join('/');
      for (const one of importsOf(readFileSync(path, 'utf8'), path)) {
        const why = directionFault(file, one);
        if (why !== null) faults.push(`packages/${file}:${one.line}: import of "${one.specifier}": ${why}`);
      }
    }
  }
  return faults;
}

function sourcesBelow(folder) {
  return readdirSync(folder, { withFileTypes: true, recursive: true })
    .filter((entry) => entry.isFile() && /\.tsx?$/.test(entry.name))
    .map((entry) => join(entry.parentPath, entry.name))
    .sort();
}

if (process.argv[1] !== undefined && import.meta.url === pathToFileURL(process.argv[1]).href) {
  const root = dirname(dirname(fileURLToPath(import.meta.url)));
  const faults = checkDirections(join(root, 'packages'));
  for (const fault of faults) console.error(fault);
  console.error(faults.length === 0 ? 'import directions: kept' : `import directions: ${faults.length} broken`);
  process.exitCode = faults.length === 0 ? 0 : 1;
}
