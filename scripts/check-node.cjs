'use strict';
// Old syntax on purpose: this file must run on any Node, to say plainly what is wrong.
var parts = process.versions.node.split('.');
var major = Number(parts[0]);
var minor = Number(parts[1]);
if (major < 20 || (major === 20 && minor < 19)) {
  console.error(
    'Wakeloom needs Node 20.19 or newer, this is Node ' +
      process.versions.node +
      '. Install a newer Node (nodejs.org) and try again.',
  );
  process.exit(1);
}
