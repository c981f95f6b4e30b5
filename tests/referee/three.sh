#!/usr/bin/env bash
# three.sh SKINFOLD FOLDER: installs three.js into FOLDER by npm (once) and holds our linear
# blending of the demo against it. Exit code 77 where npm or its registry is not at hand.
set -euo pipefail
project=$(cd "$(dirname "$0")/../.." && pwd)
mkdir -p "$2"
if [ ! -f "$2/node_modules/three/package.json" ]; then
  command -v npm >/dev/null || { echo "skipped: no npm"; exit 77; }
  npm install --prefix "$2" --silent --no-audit --no-fund three@0.187.0 ||
    { echo "skipped: npm cannot install three"; exit 77; }
fi
THREE_FOLDER=$2 exec node "$project/tests/referee/three_linear_blend.mjs" "$1" \
  "$project/suites/demo/suite.json" "$project/suites/demo/strider.glb"
