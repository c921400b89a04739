this is no netCDF file
