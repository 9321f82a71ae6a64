#!/bin/sh
# Makes the two embedded fonts from DejaVu Sans 2.37 (Debian: fonts-dejavu-core)
# with fonttools (PyPI). Latin-1, Greek, super- and subscripts, arrows, the signs
# of arithmetic and a few shapes; the old kern table is kept because it is the
# one the outline reader knows, the layout tables it does not know are dropped.
set -eu
cd "$(dirname "$0")"
for face in DejaVuSans DejaVuSans-Bold; do
  pyftsubset "/usr/share/fonts/truetype/dejavu/$face.ttf" \
    --unicodes="U+0020-007E,U+00A0-00FF,U+0370-03FF,U+2010-2015,U+2018-201F,U+2020,U+2022,U+2026,U+2030,U+2032,U+2033,U+2070-209C,U+20AC,U+2126,U+2190-2195,U+21D2,U+2202,U+2206,U+2211,U+2212,U+2213,U+221A,U+221D,U+221E,U+2220,U+2225,U+222B,U+2243,U+2245,U+2248,U+2260,U+2261,U+2264,U+2265,U+226A,U+226B,U+25A0,U+25A1,U+25B2,U+25B3,U+25BC,U+25BD,U+25C6,U+25C7,U+25CB,U+25CF,U+2713,U+2717" \
    --legacy-kern --no-hinting --layout-features= \
    --drop-tables+=GPOS,GSUB,GDEF,MATH,FFTM --output-file="$face-subset.ttf"
done
