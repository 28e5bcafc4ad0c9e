/**
 * NetCDF-4's mark on an HDF5 dimension scale that only gives a size (netCDF-C file format specification, section
 * "Dimensions without coordinate variables"); the size follows in ten characters.
 */
export const SIZE_ONLY = 'This is a netCDF dimension but not a netCDF variable.';
