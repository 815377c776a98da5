#!/usr/bin/env bash
# Fetches the accessibility checker that tests/app/test_browser.py runs in the pages. Not committed.
set -euo pipefail
cd "$(dirname "$0")/../.."
target=".axe"
[ -s "$target/axe.min.js" ] && exit 0
if ! command -v npm >/dev/null; then
  apt-get update -q
  DEBIAN_FRONTEND=noninteractive apt-get install -q -y --no-install-recommends npm
fi
mkdir -p "$target"
(cd "$target" && npm pack --silent axe-core@4 >/dev/null && tar -xzf axe-core-*.tgz && cp package/axe.min.js . && rm -rf package axe-core-*.tgz)
test -s "$target/axe.min.js"
