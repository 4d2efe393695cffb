//! Hidden pixels: which are in either exposure, and what stands in their place.

use std::borrow::Cow;

use ndarray::Array2;

/// The pixels that are hidden in one exposure or the other.
pub(crate) fn in_either(masks: [Option<&Array2<bool>>; 2]) -> Option<Array2<bool>> {
    match masks {
        [Some(first), Some(second)] => Some(first | second),
        [first, second] => first.or(second).cloned(),
    }
}

/// The image with the mean of what is lit in the place of what `mask` hides.
///
/// Hidden pixels have no say of their own, but reading between pixels reaches some px past the
/// one asked for: without this a saturated reflection would shine into what is lit beside it.
pub(crate) fn evened<'a>(
    image: &'a Array2<f32>,
    mask: Option<&Array2<bool>>,
) -> Cow<'a, Array2<f32>> {
    let Some(mask) = mask else {
        return Cow::Borrowed(image);
    };
    let (mut sum, mut lit) = (0.0, 0.0);
    for (level, hidden) in image.iter().zip(mask) {
        if !hidden {
            sum += f64::from(*level);
            lit += 1.0;
        }
    }
    let mean = if lit > 0.0 { (sum / lit) as f32 } else { 0.0 };
    let mut image = image.clone();
    image.zip_mut_with(mask, |level, hidden| {
        if *hidden {
            *level = mean;
        }
    });
    Cow::Owned(image)
}
