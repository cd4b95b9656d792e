package demo

const readme = `Demo tables of pinfill. Everything in them is invented: there is no such tidal flat and there are no
such pumps. Use them to try the program, not to learn about seabeds or pumps.

seabed.csv         sounding cells of a tidal flat
  cell             name of the cell
  easting_m        position of the cell, metres, on an invented grid
  northing_m
  depth_m          metres below chart datum, negative where the flat dries
  backscatter_db   strength of the echo, dB
  roughness_cm     root mean square height of the bottom within the cell, cm
  slope_deg        steepest slope within the cell, degrees
  bottom           mud, sand, gravel, shell or eelgrass where a grab sample was taken, else empty
grain.csv          the same cells
  grain_phi        median grain size of the grab sample in phi units (minus log2 of the diameter in mm), else empty
clips.csv          sound clips of pumps
  clip             name of the clip
  band_*hz_db      sound level in a third-octave band, dB
  level_db, crest_factor, kurtosis, centroid_hz, blade_ratio, flatness   figures of the whole clip
  state            normal, cavitating, worn_bearing or loose_mount where a mechanic listened, else empty
*_truth.csv        what every row would have been labelled, for "pinfill assess" only

The labelled rows were drawn at random, each row as likely as any other.
`
