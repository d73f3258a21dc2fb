//! Kernels compiled twice: for the instructions that every processor of the kind has, and for 256-bit ones, chosen when
//! the program runs.
//!
//! Only the width changes, never the order of operations, and no products and sums are fused: every processor gives
//! the same bits.

/// Makes a function whose body runs with the widest instructions the processor has. What the body calls must be inlined,
/// or it stays as narrow as the rest of the program.
macro_rules! widest {
    ($(#[$meta:meta])* $vis:vis fn $name:ident($($arg:ident: $kind:ty),* $(,)?) $(-> $out:ty)? $body:block) => {
        $(#[$meta])*
        $vis fn $name($($arg: $kind),*) $(-> $out)? {
            struct Work<T>(T);
            impl pulp::NullaryFnOnce for Work<($($kind,)*)> {
                type Output = widest!(@out $($out)?);

                #[inline(always)]
                fn call(self) -> Self::Output {
                    let Self(($($arg,)*)) = self;
                    $body
                }
            }
            pulp::Arch::new().dispatch(Work(($($arg,)*)))
        }
    };
    (@out) => { () };
    (@out $out:ty) => { $out };
}

pub(super) use widest;

#[cfg(test)]
mod tests;
