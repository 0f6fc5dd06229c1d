# Aimwell - SPDX-License-Identifier: GPL-3.0-or-later
# Loose images: folders, names, channels, gates, empty frames.
image=$SAMPLES/frames/nuclei-1.tif
run aimwell segment $image --labels none/such | sed "s|$SAMPLES|SAMPLES|g"
run aimwell segment absent.tif --table t.csv
run aimwell segment $image --labels out --table t.csv | sed "s|$SAMPLES|SAMPLES|g"
head -1 t.csv
tail -n +2 t.csv | wc -l
run aimwell segment $image --table um.csv --pixel-um 0.65 --gated | sed "s|$SAMPLES|SAMPLES|g"
head -1 um.csv
cp $image nuclei-1.png
mkdir twin && cp $image twin/nuclei-1.tif
run aimwell segment $image twin/nuclei-1.tif --labels out2 | sed "s|$SAMPLES|SAMPLES|g"
/usr/bin/python3 - <<'P'
import numpy as np, tifffile
rng = np.random.default_rng(4)
tifffile.imwrite('blank.tif', np.full((300, 400), 120, np.uint16))
tifffile.imwrite('noise.tif', rng.normal(300, 12, (300, 400)).astype(np.uint16))
tifffile.imwrite('rgb.tif', rng.integers(0, 255, (64, 64, 3)).astype(np.uint8), photometric='rgb')
tifffile.imwrite('one.tif', np.zeros((1, 1), np.uint8))
tifffile.imwrite('nan.tif', np.full((40, 40), np.nan, np.float32))
P
run aimwell segment blank.tif noise.tif one.tif --labels out3 --table blank.csv
tail -n +2 blank.csv | wc -l
run aimwell segment rgb.tif --table rgb.csv
run aimwell segment rgb.tif --table rgb.csv --channel 1
run aimwell segment nan.tif --table nan.csv
run aimwell segment $image --labels /dev/null/x | sed "s|$SAMPLES|SAMPLES|g"
run aimwell segment $image --table /dev/full | sed "s|$SAMPLES|SAMPLES|g"
printf 'file,stage_x_um,stage_y_um,pixel_um\nblank.tif,0,0,0.65\nnoise.tif,200,0,0.65\n' > blank_scan.csv
quietly aimwell start blank.dish --scan blank_scan.csv
run aimwell segment blank.dish
aimwell journal blank.dish | wc -l
list
