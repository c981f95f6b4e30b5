#!/usr/bin/env bash
# The committed demo creature is what scripts/make_demo makes, byte for byte. Would catch: an edit of
# the generator without its output, an edit of the output by hand, a generator whose bytes depend on
# the run, the processor or the hash seed. Equality of bytes needs no source: elementary.
set -euo pipefail

root=$(cd "$(dirname "${BASH_SOURCE[0]}")/../.." && pwd)
made=$(mktemp -d)
trap 'rm -rf "$made"' EXIT

# The plainest instructions of the processor and a hash seed of its own: neither may change a bit.
NPY_DISABLE_CPU_FEATURES="AVX512F AVX512CD AVX512_SKX AVX2 FMA3" PYTHONHASHSEED=4711 \
  PYTHONWARNINGS=ignore "$root/scripts/make_demo" "$made" > /dev/null

status=0
for file in strider.glb delivery/strider_reexport.gltf delivery/strider_reexport.bin \
            delivery/strider_repaint.glb; do
  if ! cmp "$made/$file" "$root/suites/demo/$file"; then
    echo "suites/demo/$file is not what scripts/make_demo makes: run it and commit both" >&2
    status=1
  fi
done

# Every file the generator writes is on the list above.
if [ "$(find "$made" -type f | wc -l)" -ne 4 ]; then
  echo "scripts/make_demo writes files that this test does not compare:" >&2
  (cd "$made" && find . -type f) >&2
  status=1
fi
exit $status
