# Aimwell - SPDX-License-Identifier: GPL-3.0-or-later
# A scan whose images carry OME positions needs no table; "reference frame" is no length and asks for one.
/usr/bin/python3 - "$SAMPLES" <<'P'
import csv, sys, tifffile
rows = list(csv.DictReader(open(sys.argv[1] + '/scan.csv')))
for k, row in enumerate(rows[:2], 1):
    image = tifffile.imread(f'{sys.argv[1]}/{row["file"]}')
    for unit, name in (('µm', f'ome{k}.ome.tif'), ('reference frame', f'frame{k}.ome.tif')):
        tifffile.imwrite(name, image, metadata={'axes': 'YX', 'PhysicalSizeX': 0.65, 'PhysicalSizeY': 0.65,
                         'Plane': {'PositionX': [float(row['stage_x_um'])], 'PositionY': [float(row['stage_y_um'])],
                                   'PositionXUnit': [unit], 'PositionYUnit': [unit]}})
P
run aimwell start a.dish ome1.ome.tif ome2.ome.tif
run aimwell start b.dish frame1.ome.tif frame2.ome.tif
run aimwell start c.dish $SAMPLES/frames/nuclei-1.tif | sed "s|$SAMPLES|SAMPLES|"
quietly aimwell segment a.dish
aimwell status a.dish | grep -E 'Scan|Nuclei'
list
