#!/usr/bin/env node
console.log(process.version, process.argv.slice(2));
