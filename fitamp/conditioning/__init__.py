"""From a sweep as read to a sweep fit for fitting: sign, band, spurs, repeats, fixture. One module each."""
