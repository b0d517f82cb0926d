"""Whether the program reproduces what others published and what must hold exactly; how it scores on measurements."""
