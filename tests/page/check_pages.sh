#!/bin/sh
# SPDX-License-Identifier: GPL-3.0-or-later
# Writes the pages of all scenarios, of hostile labels and of small and large rings, and asks a
# browser about them: at 390 and 1200 px, light and dark, and on A4. Exit 77 (skipped), saying so,
# where chromium, xmllint or pdftotext are missing. $RINGFETTLE, $RINGFETTLE_SOURCE, $PAGE_MAKER.
set -u
here=$RINGFETTLE_SOURCE/tests/page
for tool in chromium xmllint pdftotext; do
    command -v "$tool" >/dev/null 2>&1 && continue
    echo "SKIPPED: $tool is missing, so no page was looked at (.ci/setup ci installs it)"
    exit 77
done
work=$(mktemp -d)
trap 'rm -rf "$work"' EXIT
bad=0
complain()
{
    echo "FAILED: $*"
    bad=1
}

browse() # profile, options...
{
    profile=$work/profile-$1
    shift
    timeout 150 chromium --headless --no-sandbox --disable-gpu --disable-quic --no-first-run \
        --disable-background-networking --disable-component-update --disable-sync \
        --host-resolver-rules="MAP * ~NOTFOUND" \
        --user-data-dir="$profile" "$@" 2>"$work/browser.err"
}

# --- the pages ---
mkdir "$work/page" "$work/copy"
for job in "$RINGFETTLE_SOURCE"/scenarios/*.json "$here"/jobs/*-labels.json "$here"/jobs/one-point.json \
    "$here"/jobs/two-points.json; do
    name=$(basename "$job" .json)
    "$RINGFETTLE" diagnose --page "$work/page/$name.html" "$job" || complain "$name: no page"
done
# Rings too large to be diagnosed in a test: their diagnosis is made up.
for name in sixty-points two-hundred-points; do
    "$PAGE_MAKER" "$here/jobs/$name.json" >"$work/page/$name.html" || complain "$name: no page"
done
"$RINGFETTLE" review --page "$work/archive" "$RINGFETTLE_SOURCE/scenarios" >/dev/null 2>&1 ||
    complain "review --page"
cp "$work/archive/index.html" "$work/page/archive.html" || complain "no archive page"

# --- as text ---
for page in "$work"/page/*.html; do
    name=$(basename "$page")
    xmllint --noout "$page" || complain "$name: not well-formed"
    # in tags and the style sheet: what is text has no < of its own
    grep -oE '<(script|link|img|iframe|object|embed|base|form)|<[a-z][^>]* (src|style|on[a-z]+)="' "$page" |
        sed "s/^/FAILED: $name: /" | grep . && bad=1
    sed 's/<title>[^<]*//; s/>[^<]*</></g' "$page" | grep -nE 'https?:|url\(|@import' && complain "$name: outside"
    grep -q "default-src &#39;none&#39;" "$page" || complain "$name: no policy"
done

# --- copies with a script that looks ---
frames=
for page in "$work"/page/*.html; do
    name=$(basename "$page" .html)
    # without the policy, so that whatever could run does run
    {
        sed -e 's/<meta http-equiv="Content-Security-Policy"[^>]*>//' -e 's,</body></html>,,' "$page"
        echo '<script>'
        cat "$here/check.js"
        echo '</script></body></html>'
    } >"$work/copy/$name.html"
    for width in 390 1200; do
        frames="$frames<iframe name='$name-$width' width='$width' height='3000' src='copy/$name.html'></iframe>"
    done
done
expected=$(($(ls "$work/page" | wc -l) * 2))
cat >"$work/all.html" <<END
<!DOCTYPE html><meta charset="utf-8"><style>iframe{border:0}</style><pre id="verdicts"></pre><script>
addEventListener('message', function (event) {
    document.getElementById('verdicts').textContent += 'VERDI' + 'CT ' + event.data + '\n';
});</script>$frames
END
for scheme in 1 0; do # light, dark
    browse "scheme-$scheme" --blink-settings=preferredColorScheme=$scheme \
        --virtual-time-budget=60000 --dump-dom "file://$work/all.html" >"$work/dom"
    sed -n 's/.*VERDICT //p' "$work/dom" >"$work/verdicts"
    told=$(wc -l <"$work/verdicts")
    [ "$told" -eq "$expected" ] || complain "scheme $scheme: $told verdicts of $expected"
    awk -F '\t' '$3 != "" {print "FAILED: " $1 ": " $3; bad = 1} $2 < 1 && $1 !~ /archive/ {
        print "FAILED: " $1 ": no drawing"; bad = 1} END {exit bad}' "$work/verdicts" || bad=1
done

# --- no request: whatever a page asked for would be named in it, and the hostile one names a host.
# (The browser asks for things of its own; its names are resolved by nobody here.) ---
browse net --log-net-log="$work/net.json" --dump-dom "file://$work/page/hostile-labels.html" >"$work/dom"
grep -q '<main>' "$work/dom" || complain "the page itself did not open"
grep -qF 'outside.invalid' "$here/jobs/hostile-labels.json" || complain "the hostile job is tame"
[ -s "$work/net.json" ] || complain "no log of requests"
grep -oE '"[^"]*outside\.invalid[^"]*' "$work/net.json" && complain "requests leave the page"

# --- on paper: one after another, since a browser's start takes longest ---
{
    sed -n '1,/<body>/p' "$work/page/two-points.html" | sed 's/<body>.*/<body>/'
    for page in "$work"/page/*.html; do
        echo '<div class="sheet">'
        sed -n '/<body>/,$p' "$page" | sed -e 's/.*<body>//' -e 's,</body></html>,,'
        echo '</div>'
    done
    echo '</body></html>'
} | sed 's,</style>,.sheet{break-after:page}</style>,' >"$work/print.html"
browse print --print-to-pdf="$work/print.pdf" --no-pdf-header-footer "file://$work/print.html" >/dev/null
pdftotext -bbox "$work/print.pdf" "$work/words.html" || complain "no PDF"
# A word on a page is within its margins, and no two lie on one another.
awk '
function value(name) { match($0, name "=\"[-0-9.]*"); return substr($0, RSTART + length(name) + 2, RLENGTH - length(name) - 2) + 0 }
/<page / { width = value("width"); height = value("height"); n = 0; pages++ }
/<word / {
    x1 = value("xMin"); y1 = value("yMin"); x2 = value("xMax"); y2 = value("yMax"); words++
    text = $0; sub(/^[^>]*>/, "", text); sub(/<.*/, "", text)
    if (x1 < 30 || x2 > width - 30 || y1 < 25 || y2 > height - 25) { print "FAILED: A4 page " pages ": beyond the margin: " text; bad = 1 }
    for (i = 1; i <= n; i++) {
        across = (x2 < X2[i] ? x2 : X2[i]) - (x1 > X1[i] ? x1 : X1[i])
        down = (y2 < Y2[i] ? y2 : Y2[i]) - (y1 > Y1[i] ? y1 : Y1[i])
        h = y2 - y1 < Y2[i] - Y1[i] ? y2 - y1 : Y2[i] - Y1[i]
        if (across > 1 && down > 0.4 * h) { print "FAILED: A4 page " pages ": " text " on " T[i]; bad = 1 }
    }
    n++; X1[n] = x1; X2[n] = x2; Y1[n] = y1; Y2[n] = y2; T[n] = text
}
END { if (words < 1000 || width < 590 || width > 600) { print "FAILED: " pages " sheets, " words " words, width " width; bad = 1 }
      print pages " sheets of A4, " words " words"; exit bad }' "$work/words.html" || bad=1

[ "$bad" -eq 0 ] && echo "$expected views looked at in each scheme"
exit "$bad"
