# Aimwell - SPDX-License-Identifier: GPL-3.0-or-later
# Scan tables and images that cannot be used: the message names file, place, value and limit; no record appears.
small_scan
table() { printf "$1" > bad.csv; run aimwell start bad.dish --scan bad.csv; }
a=$(sed -n 2p scan.csv | cut -d, -f1)
b=$(sed -n 3p scan.csv | cut -d, -f1)
cp "$a" a.tif
cp "$b" b.tif
run aimwell start bad.dish --scan nowhere.csv
table ''
table 'file,stage_x_um,stage_y_um\n'
table 'file,stage_x_um\na.tif,1\n'
table 'file,stage_x_mm,stage_y_mm\na.tif,1,1\n'
table 'file,stage_x_um,stage_y_um\na.tif,one,1\n'
table 'file,stage_x_um,stage_y_um\na.tif,"1,5",1\n'
table 'file,stage_x_um,stage_y_um\na.tif,nan,1\n'
table 'file,stage_x_um,stage_y_um\na.tif,1e300,1\n'
table 'file,stage_x_um,stage_y_um\na.tif,1\n'
table 'file,stage_x_um,stage_y_um\na.tif,0,0\na.tif,500,0\n'
table 'file,stage_x_um,stage_y_um\nabsent.tif,0,0\n'
table 'file,stage_x_um,stage_y_um,pixel_um\na.tif,0,0,-1\n'
table 'file,stage_x_um,stage_y_um,pixel_um\na.tif,0,0,0.65\nb.tif,600,0,0.5\n'
table 'file,stage_x_um,stage_y_um,taken_at\na.tif,0,0,yesterday\n'
table 'file,stage_x_um,stage_y_um,page\na.tif,0,0,7\n'
table 'file,stage_x_um,stage_y_um,channel\na.tif,0,0,3\n'
echo "not an image" > text.tif
table 'file,stage_x_um,stage_y_um\ntext.tif,0,0\n'
: > empty.tif
table 'file,stage_x_um,stage_y_um\nempty.tif,0,0\n'
head -c 3 a.tif > short.tif
table 'file,stage_x_um,stage_y_um\nshort.tif,0,0\n'
head -c 20000 a.tif > cut.tif
table 'file,stage_x_um,stage_y_um\ncut.tif,0,0\n'
list
# These are accepted: a byte order mark and CRLF, a Windows path, an unknown column (a warning), frames far apart (a warning).
mkdir -p sub && cp a.tif b.tif sub/
printf '\357\273\277file,stage_x_um,stage_y_um,mood,pixel_um\r\nsub\\a.tif,0,0,good,0.65\r\nsub\\b.tif,90000,0,bad,0.65\r\n' > good.csv
run aimwell start good.dish --scan good.csv
run aimwell start good.dish --scan good.csv
run aimwell start nofolder/x.dish --scan good.csv
