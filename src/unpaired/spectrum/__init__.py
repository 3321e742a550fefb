"""Line positions and curves of isotropic spectra."""
