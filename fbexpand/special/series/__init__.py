"""Series of Bessel functions beside Fourier-Bessel: Neumann's, Kapteyn's and Schlömilch's."""
